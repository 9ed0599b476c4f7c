"""Mission -> Machine. One block a leg, wait, loop or other step; its exits are wired to what follows it in the text.

The work is linear in the number of steps: fragments are shared by every leg under the same rule, and exits that
lead to a step not yet compiled stay open until it is. Only a visit by shortest or nearest way looks at the floor.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field, replace
from typing import Any

from runner.language.collection import collection_off
from runner.language.expressions import Condition, Expression, Quantity
from runner.language.mission import (
    Ask,
    Charge,
    Count,
    End,
    Go,
    Mark,
    Mission,
    Notify,
    Order,
    Otherwise,
    Overrun,
    Repeat,
    RetryRule,
    Run,
    StandingOrder,
    Step,
    Then,
    Visit,
    Wait,
    When,
)
from runner.machine import regions
from runner.machine.leg import leg_fragment
from runner.machine.ordering import Lengths, floor_lengths, shortest_order
from runner.machine.table import Address, Block, Ending, Exit, Fragment, Machine, OrderEntry, StepNote, Target
from runner.machine.wording import say_seconds
from runner.site.values import Place

DEFAULT_OTHERWISE = Otherwise.END
"""What follows a failed leg where the author wrote nothing: the robot halts and the mission ends. The safe default."""

DEFAULT_OTHERWISE_OF_WAITS = Otherwise.SKIP
"""What follows a wait for a condition that was in vain: the mission goes on."""

OpenExit = tuple[int, Exit]
"""A block whose exit leads nowhere yet."""

Compiled = tuple[Address, list[OpenExit]]
"""Where something begins, and the exits that lead on to what follows it."""


@dataclass(slots=True)
class _Draft:
    """A block being wired. `more` are the fields of the block that only some kinds of steps have."""

    fragment: str
    step: int | None
    more: dict[str, Any] = field(default_factory=dict)
    exits: dict[Exit, Address] = field(default_factory=dict)

    def block(self) -> Block:
        return Block(self.fragment, self.step, tuple(self.exits.items()), **self.more)


@dataclass(slots=True)
class _Sheet:
    """What has been compiled so far. `rule_fragments` maps a rule to the name of its fragment; `loops` are those
    around the step being compiled; `before` is the place the robot was last sent to, in the order of the text."""

    mission: Mission
    lengths: Lengths
    before: Place
    blocks: list[_Draft] = field(default_factory=list)
    steps: list[StepNote] = field(default_factory=list)
    fragments: dict[str, Fragment] = field(default_factory=dict)
    places: dict[Place, int] = field(default_factory=dict)
    targets: list[Target] = field(default_factory=list)
    endings: dict[Ending, Address] = field(default_factory=dict)
    rule_fragments: dict[str, str] = field(default_factory=dict)
    loops: list[int] = field(default_factory=list)
    needs_lengths: bool = False

    def note(self, text: str, depth: int, mark: Mark) -> int:
        self.steps.append(StepNote(text, depth, mark, tuple(self.loops)))
        return len(self.steps) - 1

    def place(self, fragment: Fragment, step: int | None, **more: Any) -> int:
        """Lay down a block of that fragment and give its number."""
        self.blocks.append(_Draft(self.use(fragment), step, more))
        return len(self.blocks) - 1

    def use(self, fragment: Fragment) -> str:
        self.fragments.setdefault(fragment.name, fragment)
        return fragment.name

    def leg(self, rule: RetryRule) -> Fragment:
        if rule.name not in self.rule_fragments:
            self.rule_fragments[rule.name] = self.use(leg_fragment(rule))
        return self.fragments[self.rule_fragments[rule.name]]

    def target(self, place: Place) -> int:
        if place not in self.places:
            self.places[place] = len(self.targets)
            self.targets.append(Target(place.name, place.pose))
        return self.places[place]

    def connect(self, open_exits: Iterable[OpenExit], to: Address) -> None:
        for block, exit_ in open_exits:
            self.blocks[block].exits[exit_] = to


@collection_off()
def compile_mission(mission: Mission, lengths: Lengths = floor_lengths) -> Machine:
    """The machine of a checked mission. `lengths` gives the route lengths a visit by shortest or nearest way needs."""
    sheet = _Sheet(mission, lengths, mission.start)
    held = (sheet.place(regions.HELD, None), 0)
    for ending, fragment in regions.ENDINGS.items():
        sheet.endings[ending] = (sheet.place(fragment, None), 0)
    start, open_exits = _steps(sheet, mission.steps, 0)
    sheet.connect(open_exits, sheet.endings[Ending.COMPLETED])
    orders = tuple(_order(sheet, order) for order in mission.orders)
    home = sheet.target(mission.start) if sheet.needs_lengths else sheet.places.get(mission.start)
    limit = mission.limits.speed
    return Machine(
        name=mission.name,
        start=start,
        fragments=sheet.fragments,
        blocks=tuple(draft.block() for draft in sheet.blocks),
        anywhere=regions.ANYWHERE,
        exits=(
            (Exit.HELD, held),
            (Exit.ABORTED, sheet.endings[Ending.ABORTED]),
            (Exit.TIMED_OUT, sheet.endings[Ending.TIMED_OUT]),
        ),
        steps=tuple(sheet.steps),
        places=tuple(sheet.targets),
        speed=mission.robot.speed if limit is None else min(limit, mission.robot.speed),
        end_by=mission.limits.end_by,
        orders=orders,
        prove=mission.prove,
        home=home,
        lengths=lengths(mission, tuple(sheet.places)) if sheet.needs_lengths else (),
    )


def _steps(sheet: _Sheet, steps: tuple[Step, ...], depth: int) -> Compiled:
    """Compile steps one after the other."""
    first, open_exits = _step(sheet, steps[0], depth)
    for step in steps[1:]:
        entry, following = _step(sheet, step, depth)
        sheet.connect(open_exits, entry)
        open_exits = following
    return first, open_exits


def _step(sheet: _Sheet, step: Step, depth: int) -> Compiled:
    return _STEPS[type(step)](sheet, step, depth)


# --- legs ---------------------------------------------------------------------------------------------------------


def _go(sheet: _Sheet, step: Go, depth: int) -> Compiled:
    text = step.place.name if step.relative else f"go to {step.place.name}"
    return _leg(sheet, step, step.place, sheet.note(text, depth, step.mark), depth)


def _leg(sheet: _Sheet, step: Go | Visit | Charge, place: Place, note: int, depth: int) -> Compiled:
    """One leg, and what follows if it fails."""
    within = None if isinstance(step, Charge) else step.within
    relative = isinstance(step, Go) and step.relative
    if not relative:
        sheet.before = place
    block = sheet.place(sheet.leg(step.rule), note, place=sheet.target(place), relative=relative, seconds=within)
    open_exits = [(block, Exit.NEXT), (block, Exit.SKIPPED)]
    return (block, 0), open_exits + _otherwise(sheet, [(block, Exit.FAILED)], step.otherwise, DEFAULT_OTHERWISE, depth)


def _otherwise(
    sheet: _Sheet,
    failed: list[OpenExit],
    written: Otherwise | tuple[Step, ...] | None,
    default: Otherwise,
    depth: int,
) -> list[OpenExit]:
    """Wire what failed to what the author wrote for it; the exits that lead on from there."""
    otherwise = default if written is None else written
    if otherwise is Otherwise.SKIP:
        return failed
    if otherwise is Otherwise.END:
        sheet.connect(failed, sheet.endings[Ending.LEG_FAILED])
        return []
    before = sheet.before
    entry, following = _steps(sheet, otherwise, depth + 1)
    sheet.connect(failed, entry)
    sheet.before = before
    return following


def _visit(sheet: _Sheet, step: Visit, depth: int) -> Compiled:
    count = len(step.places)
    manner = "" if step.order is Order.LISTED else f", {step.order.value}"
    note = sheet.note(f"visit {count} place{'s' if count > 1 else ''}{manner}", depth, step.mark)
    if step.order in (Order.LISTED, Order.SHORTEST):
        return _visit_in_turn(sheet, step, _text_order(sheet, step), depth)
    return _visit_as_it_comes(sheet, step, note, depth)


def _text_order(sheet: _Sheet, step: Visit) -> list[int]:
    """The order in which the places are visited, where it is known before the robot moves."""
    if step.order is Order.LISTED:
        return list(range(len(step.places)))
    places = (sheet.before, *(place for _, place in step.places))
    return [index - 1 for index in shortest_order(sheet.lengths(sheet.mission, places))]


def _visit_in_turn(sheet: _Sheet, step: Visit, indices: list[int], depth: int) -> Compiled:
    first, open_exits = _visit_one(sheet, step, indices[0], depth)
    for index in indices[1:]:
        entry, following = _visit_one(sheet, step, index, depth)
        sheet.connect(open_exits, entry)
        open_exits = following
    return first, open_exits


def _visit_one(sheet: _Sheet, step: Visit, index: int, depth: int) -> Compiled:
    mark, place = step.places[index]
    note = sheet.note(place.name, depth + 1, mark)
    if step.each:
        sheet.before = place
        return _steps(sheet, step.each[index], depth + 2)
    return _leg(sheet, step, place, note, depth + 1)


def _visit_as_it_comes(sheet: _Sheet, step: Visit, note: int, depth: int) -> Compiled:
    """The next place is picked each time the last one is done with."""
    branch_places = tuple(sheet.target(place) for _, place in step.places)
    block = sheet.place(regions.VISIT, note, order=step.order, branch_places=branch_places)
    branches = []
    for index in range(len(step.places)):
        entry, following = _visit_one(sheet, step, index, depth)
        sheet.connect(following, (block, regions.VISIT_NEXT))
        branches.append(entry)
    sheet.blocks[block].more["branches"] = tuple(branches)
    sheet.needs_lengths = sheet.needs_lengths or step.order is Order.NEAREST
    return (block, regions.VISIT_ENTER), [(block, Exit.NEXT)]


def _charge(sheet: _Sheet, step: Charge, depth: int) -> Compiled:
    """A leg to the charger, then charging; what follows a failure is written once and shared by both."""
    note = sheet.note(f"charge at {step.place.name} until {step.until.text}", depth, step.mark)
    leg = sheet.place(sheet.leg(step.rule), note, place=sheet.target(step.place))
    charge = sheet.place(regions.CHARGE, note, condition=_bound(sheet, step.until), seconds=step.up_to)
    sheet.before = step.place
    sheet.connect([(leg, Exit.NEXT)], (charge, 0))
    open_exits = [(leg, Exit.SKIPPED), (charge, Exit.NEXT), (charge, Exit.SKIPPED)]
    failed = [(leg, Exit.FAILED), (charge, Exit.FAILED)]
    return (leg, 0), open_exits + _otherwise(sheet, failed, step.otherwise, DEFAULT_OTHERWISE, depth)


# --- steps that stand still or take no time -----------------------------------------------------------------------


def _wait(sheet: _Sheet, step: Wait, depth: int) -> Compiled:
    if step.until is None:
        note = sheet.note(f"wait {say_seconds(step.seconds or 0.0)}", depth, step.mark)
        block = sheet.place(regions.WAIT, note, seconds=step.seconds)
        return (block, 0), [(block, Exit.NEXT), (block, Exit.SKIPPED)]
    note = sheet.note(f"wait until {step.until.text}", depth, step.mark)
    block = sheet.place(regions.WAIT_UNTIL, note, condition=_bound(sheet, step.until), seconds=step.up_to)
    open_exits = [(block, Exit.NEXT), (block, Exit.SKIPPED)]
    failed = [(block, Exit.FAILED)]
    return (block, 0), open_exits + _otherwise(sheet, failed, step.otherwise, DEFAULT_OTHERWISE_OF_WAITS, depth)


def _ask(sheet: _Sheet, step: Ask, depth: int) -> Compiled:
    note = sheet.note(f'ask "{step.text}"', depth, step.mark)
    block = sheet.place(
        regions.ASK, note, text=step.text, answers=step.answers, word=step.if_silent, seconds=step.up_to
    )
    return (block, 0), [(block, Exit.NEXT), (block, Exit.SKIPPED)]


def _count(sheet: _Sheet, step: Count, depth: int) -> Compiled:
    by = "" if step.by == 1 else f" by {step.by}"
    block = sheet.place(
        regions.COUNT, sheet.note(f"count {step.name}{by}", depth, step.mark), word=step.name, by=step.by
    )
    return (block, 0), [(block, Exit.NEXT)]


def _notify(sheet: _Sheet, step: Notify, depth: int) -> Compiled:
    block = sheet.place(regions.NOTIFY, sheet.note(f'notify "{step.text}"', depth, step.mark), text=step.text)
    return (block, 0), [(block, Exit.NEXT)]


def _end(sheet: _Sheet, step: End, depth: int) -> Compiled:
    ending = Ending.COMPLETED if step.completed else Ending.GIVEN_UP
    note = sheet.note(f"end, {ending.value}", depth, step.mark)
    block = sheet.place(regions.ENDINGS[ending], note, text=step.because)
    return (block, 0), []


# --- steps with steps in them -------------------------------------------------------------------------------------


def _repeat(sheet: _Sheet, step: Repeat, depth: int) -> Compiled:
    bound = _bound_of(step)
    note = sheet.note(_repeat_text(step), depth, step.mark)
    block = sheet.place(
        regions.loop_fragment(bound, step.every is not None),
        note,
        times=step.times,
        seconds=step.seconds,
        every=step.every,
        wait_for_interval=step.overrun is Overrun.NEXT_INTERVAL,
    )
    sheet.loops.append(block)
    if step.until is not None:
        sheet.blocks[block].more["condition"] = _bound(sheet, step.until)
    body, open_exits = _steps(sheet, step.steps, depth + 1)
    sheet.loops.pop()
    sheet.connect([(block, Exit.BODY)], body)
    sheet.connect(open_exits, (block, regions.LOOP_HEAD))
    return (block, regions.LOOP_ENTER), [(block, Exit.NEXT)] if bound != "for ever" else []


def _bound_of(step: Repeat) -> str:
    if step.times is not None:
        return "times"
    if step.seconds is not None:
        return "for"
    return "for ever" if step.until is None else "until"


def _repeat_text(step: Repeat) -> str:
    every = f", every {say_seconds(step.every)}" if step.every is not None else ""
    if step.times is not None:
        return f"repeat {step.times} times{every}" if step.times > 1 else "repeat once"
    if step.seconds is not None:
        return f"repeat for {say_seconds(step.seconds)}{every}"
    return f"repeat until {step.until.text}{every}" if step.until is not None else f"repeat for ever{every}"


def _when(sheet: _Sheet, step: When, depth: int) -> Compiled:
    note = sheet.note(f"when {step.condition.text}", depth, step.mark)
    block = sheet.place(regions.WHEN, note, condition=_bound(sheet, step.condition))
    before = sheet.before
    entry, open_exits = _steps(sheet, step.then, depth + 1)
    sheet.connect([(block, Exit.BODY)], entry)
    sheet.before = before
    if not step.otherwise:
        return (block, 0), [*open_exits, (block, Exit.NEXT)]
    entry, following = _steps(sheet, step.otherwise, depth + 1)
    sheet.connect([(block, Exit.NEXT)], entry)
    sheet.before = before
    return (block, 0), open_exits + following


def _run(sheet: _Sheet, step: Run, depth: int) -> Compiled:
    sheet.note(f"run {step.title}", depth, step.mark)
    return _steps(sheet, step.steps, depth + 1)


def _order(sheet: _Sheet, order: StandingOrder) -> OrderEntry:
    """The steps of a standing order, and after them the way back into the mission, or its end."""
    note = sheet.note(f"standing order: {order.name}", 0, order.mark)
    entry, open_exits = _steps(sheet, order.steps, 1)
    if order.then is Then.END:
        text = f"the standing order '{order.name}' ended it"
        over = (sheet.place(regions.ENDINGS[Ending.COMPLETED], note, text=text), 0)
    else:
        back = regions.ORDER_CARRY_ON if order.then is Then.CARRY_ON else regions.ORDER_REPEAT_STEP
        over = (sheet.place(back, None), 0)
    sheet.connect(open_exits, over)
    return OrderEntry(order.name, _bound(sheet, order.condition), entry)


def _bound(sheet: _Sheet, condition: Condition) -> Condition:
    """The condition with its laps bound to the innermost loop around it."""
    loop = sheet.loops[-1] if sheet.loops else None
    return replace(condition, expression=_bind_laps(condition.expression, loop))


def _bind_laps(expression: Expression, loop: int | None) -> Expression:
    if expression.quantity is Quantity.LAPS:
        return replace(expression, loop=loop)
    if not expression.parts:
        return expression
    return replace(expression, parts=tuple(_bind_laps(part, loop) for part in expression.parts))


_STEPS: dict[type[Step], Callable[[_Sheet, Any, int], Compiled]] = {
    Go: _go,
    Visit: _visit,
    Charge: _charge,
    Wait: _wait,
    Ask: _ask,
    Count: _count,
    Notify: _notify,
    End: _end,
    Repeat: _repeat,
    When: _when,
    Run: _run,
}
