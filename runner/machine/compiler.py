"""Mission -> Machine. One block a leg, wait or loop; the exits of each are wired to what follows it in the text.

The work is linear in the number of steps: fragments are shared by every leg under the same rule, and exits that
lead to a step not yet compiled stay open until it is.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

from runner.language.mission import Go, Mark, Mission, Otherwise, Repeat, RetryRule, Step, Visit, Wait
from runner.machine.leg import leg_fragment
from runner.machine.regions import ANYWHERE, ENDINGS, ENTER, HEAD, HELD, LOOP_TIMES, LOOP_WHILE, WAIT
from runner.machine.table import Address, Block, Ending, Exit, Fragment, Machine, StepNote, Target
from runner.machine.wording import say_clock, say_seconds
from runner.site.values import Place

DEFAULT_OTHERWISE = Otherwise.END
"""What follows a failed leg where the author wrote nothing: the robot halts and the mission ends. The safe default."""

OpenExit = tuple[int, Exit]
"""A block whose exit leads nowhere yet."""


@dataclass(slots=True)
class _Draft:
    """A block being wired."""

    fragment: str
    step: int | None
    place: int | None = None
    seconds: float | None = None
    times: int | None = None
    clock: float | None = None
    exits: dict[Exit, Address] = field(default_factory=dict)

    def block(self) -> Block:
        exits = tuple(self.exits.items())
        return Block(self.fragment, self.step, exits, self.place, self.seconds, self.times, self.clock)


@dataclass(slots=True)
class _Sheet:
    """What has been compiled so far. `rule_fragments` maps a rule to the name of its fragment; `loops` are those
    around the step being compiled."""

    blocks: list[_Draft] = field(default_factory=list)
    steps: list[StepNote] = field(default_factory=list)
    fragments: dict[str, Fragment] = field(default_factory=dict)
    places: dict[str, int] = field(default_factory=dict)
    targets: list[Target] = field(default_factory=list)
    endings: dict[Ending, Address] = field(default_factory=dict)
    rule_fragments: dict[str, str] = field(default_factory=dict)
    loops: list[int] = field(default_factory=list)

    def note(self, text: str, depth: int, mark: Mark) -> int:
        self.steps.append(StepNote(text, depth, mark, tuple(self.loops)))
        return len(self.steps) - 1

    def place(self, block: _Draft) -> int:
        self.blocks.append(block)
        return len(self.blocks) - 1

    def use(self, fragment: Fragment) -> str:
        self.fragments[fragment.name] = fragment
        return fragment.name

    def leg(self, rule: RetryRule) -> str:
        if rule.name not in self.rule_fragments:
            self.rule_fragments[rule.name] = self.use(leg_fragment(rule))
        return self.rule_fragments[rule.name]

    def target(self, place: Place) -> int:
        if place.name not in self.places:
            self.places[place.name] = len(self.targets)
            self.targets.append(Target(place.name, place.pose))
        return self.places[place.name]

    def connect(self, open_exits: Iterable[OpenExit], to: Address) -> None:
        for block, exit_ in open_exits:
            self.blocks[block].exits[exit_] = to


def compile_mission(mission: Mission) -> Machine:
    """The machine of a checked mission."""
    sheet = _Sheet()
    held = (sheet.place(_Draft(sheet.use(HELD), None)), 0)
    for ending, fragment in ENDINGS.items():
        sheet.endings[ending] = (sheet.place(_Draft(sheet.use(fragment), None)), 0)
    start, open_exits = _steps(sheet, mission.steps, 0)
    sheet.connect(open_exits, sheet.endings[Ending.COMPLETED])
    limit = mission.limits.speed
    return Machine(
        name=mission.name,
        start=start,
        fragments=sheet.fragments,
        blocks=tuple(draft.block() for draft in sheet.blocks),
        anywhere=ANYWHERE,
        exits=(
            (Exit.HELD, held),
            (Exit.ABORTED, sheet.endings[Ending.ABORTED]),
            (Exit.TIMED_OUT, sheet.endings[Ending.TIMED_OUT]),
        ),
        steps=tuple(sheet.steps),
        places=tuple(sheet.targets),
        speed=mission.robot.speed if limit is None else min(limit, mission.robot.speed),
        end_by=mission.limits.end_by,
    )


def _steps(sheet: _Sheet, steps: tuple[Step, ...], depth: int) -> tuple[Address, list[OpenExit]]:
    """Compile steps one after the other: where they begin, and the exits that lead on to what follows them."""
    first, open_exits = _step(sheet, steps[0], depth)
    for step in steps[1:]:
        entry, following = _step(sheet, step, depth)
        sheet.connect(open_exits, entry)
        open_exits = following
    return first, open_exits


def _step(sheet: _Sheet, step: Step, depth: int) -> tuple[Address, list[OpenExit]]:
    match step:
        case Go():
            return _leg(sheet, step, step.place, step.mark, depth, f"go to {step.place.name}")
        case Visit():
            return _visit(sheet, step, depth)
        case Wait():
            return _wait(sheet, step, depth)
        case Repeat():
            return _repeat(sheet, step, depth)


def _leg(
    sheet: _Sheet, step: Go | Visit, place: Place, mark: Mark, depth: int, text: str
) -> tuple[Address, list[OpenExit]]:
    note = sheet.note(text, depth, mark)
    block = sheet.place(_Draft(sheet.leg(step.rule), note, sheet.target(place), step.within))
    open_exits = [(block, Exit.NEXT), (block, Exit.SKIPPED)]
    otherwise = DEFAULT_OTHERWISE if step.otherwise is None else step.otherwise
    if otherwise is Otherwise.SKIP:
        open_exits.append((block, Exit.FAILED))
    elif otherwise is Otherwise.END:
        sheet.connect([(block, Exit.FAILED)], sheet.endings[Ending.LEG_FAILED])
    else:
        entry, following = _steps(sheet, otherwise, depth + 1)
        sheet.connect([(block, Exit.FAILED)], entry)
        open_exits += following
    return (block, 0), open_exits


def _visit(sheet: _Sheet, step: Visit, depth: int) -> tuple[Address, list[OpenExit]]:
    count = len(step.places)
    sheet.note(f"visit {count} place{'s' if count > 1 else ''}", depth, step.mark)
    first: Address | None = None
    open_exits: list[OpenExit] = []
    for mark, place in step.places:
        entry, following = _leg(sheet, step, place, mark, depth + 1, place.name)
        sheet.connect(open_exits, entry)
        first, open_exits = first or entry, following
    assert first is not None, "the reader refuses an empty visit"
    return first, open_exits


def _wait(sheet: _Sheet, step: Wait, depth: int) -> tuple[Address, list[OpenExit]]:
    note = sheet.note(f"wait {say_seconds(step.seconds)}", depth, step.mark)
    block = sheet.place(_Draft(sheet.use(WAIT), note, seconds=step.seconds))
    return (block, 0), [(block, Exit.NEXT), (block, Exit.SKIPPED)]


def _repeat(sheet: _Sheet, step: Repeat, depth: int) -> tuple[Address, list[OpenExit]]:
    note = sheet.note(_repeat_text(step), depth, step.mark)
    fragment = LOOP_TIMES if step.times is not None else LOOP_WHILE
    draft = _Draft(sheet.use(fragment), note, times=step.times, seconds=step.seconds, clock=step.until_clock)
    block = sheet.place(draft)
    sheet.loops.append(block)
    body, open_exits = _steps(sheet, step.steps, depth + 1)
    sheet.loops.pop()
    sheet.connect([(block, Exit.BODY)], body)
    sheet.connect(open_exits, (block, HEAD))
    return (block, ENTER), [(block, Exit.NEXT)]


def _repeat_text(step: Repeat) -> str:
    if step.times is not None:
        return f"repeat {step.times} times" if step.times > 1 else "repeat once"
    if step.seconds is not None:
        return f"repeat for {say_seconds(step.seconds)}"
    assert step.until_clock is not None, "the reader sees to it that a repeat has one bound"
    return f"repeat until {say_clock(step.until_clock)}"
