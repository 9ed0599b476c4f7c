"""Least, likely and most time, distance and energy of each step and the whole, by interval arithmetic over the table.

The blocks are gone through in the order of the text; at each, what was spent on the way there is known within bounds,
and joined where ways join. A loop is gone through once for a lap and then once more with the bounds of all its laps.
What is taken for granted is said in words, in `Estimate.assumptions`; what nothing bounds is infinite.
"""

from __future__ import annotations

import heapq
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace

from runner.language.mission import Mission
from runner.machine.approaches import Approach, approaches
from runner.machine.assumptions import assumptions
from runner.machine.block_times import charge_level, watched
from runner.machine.condition_times import Moment, until_true
from runner.machine.leg_costs import Lengths, drive_span, leg_cost
from runner.machine.loop_costs import TICK_S, loop_cost
from runner.machine.spans import FREE, INFINITE, NOTHING, UNKNOWN, Cost, Span, one_of, product
from runner.machine.table import Block, Exit, Machine, Verb
from runner.site.charging import charging_seconds
from runner.site.values import DAY_S
from runner.site.ways import Way

RELATIVE_SLACK_M = 0.3
"""How much less than asked a drive ahead may be, for want of exactness at both ends."""

Route = tuple[int | None, int]
"""From a place of the machine (None: where the mission starts) to another."""


@dataclass(frozen=True, slots=True)
class StepEstimate:
    """One step: when it begins, seconds since the run began, and what it takes; inside a loop, for one lap.

    `drive` is that of a leg in seconds, whatever its time limits.
    """

    step: int
    begins: Span
    cost: Cost
    drive: Span = NOTHING


@dataclass(frozen=True, slots=True)
class Used:
    """Watt-hours drawn: `since` the battery was last full, and, where it is `charged`, `first` up to then."""

    since: Span = NOTHING
    first: Span = NOTHING
    charged: bool = False

    def plus(self, energy: Span) -> Used:
        first = self.first if self.charged else self.first.plus(energy)
        return Used(self.since.plus(energy), first, self.charged)


@dataclass(frozen=True, slots=True)
class Drain:
    """A step at which the battery may be empty, and whether it is so even at the least."""

    step: int
    surely: bool


@dataclass(frozen=True, slots=True)
class Estimate:
    """What a mission takes. `blocks` tells when each leg may begin, by its block; seconds since the run began."""

    begins_clock: float
    steps: tuple[StepEstimate, ...]
    whole: Cost
    unbounded: Cost
    """As `whole`, but without the end-by time cutting it short."""
    available: float
    """Seconds up to the end-by time, infinite without one."""
    legs: Mapping[int, StepEstimate]
    drains: tuple[Drain, ...]
    assumptions: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class _Flow:
    """What has been spent on the way to a block: up to where its region began, and since.

    `planned`: without a failure; `share`: how likely that way is.
    """

    base: Cost
    cost: Cost
    used: Used
    share: float
    planned: bool

    @property
    def begins(self) -> Span:
        return self.base.seconds.plus(self.cost.seconds)

    def region(self, extra: Cost) -> _Flow:
        """The same moment as the beginning of a region of its own, which may begin as much later as `extra` says."""
        return _Flow(self.base.plus(self.cost).plus(extra), FREE, self.used, self.share, self.planned)


@dataclass(slots=True)
class _Estimator:
    machine: Machine
    mission: Mission
    ways: Mapping[Route, Way]
    clock: float
    available: float
    approaches: Mapping[int, Approach] = field(default_factory=dict)
    longest: float = 0.0
    laps: dict[int, tuple[Cost, Used]] = field(default_factory=dict)
    steps: dict[int, StepEstimate] = field(default_factory=dict)
    legs: dict[int, StepEstimate] = field(default_factory=dict)
    ends: list[_Flow] = field(default_factory=list)
    drains: dict[int, Drain] = field(default_factory=dict)
    recording: bool = True


def routes_needed(machine: Machine) -> list[Route]:
    """The routes whose lengths an estimate asks for."""
    found = approaches(machine)
    return list(
        dict.fromkeys(
            (before, block.place)
            for number, block in enumerate(machine.blocks)
            if block.place is not None and not block.relative and number in found
            for before in sorted(found[number].places, key=lambda place: -1 if place is None else place)
            if before != block.place
        )
    )


def estimate(machine: Machine, mission: Mission, ways: Mapping[Route, Way], clock: float) -> Estimate:
    """What the mission takes if it begins at a time of day, seconds since midnight. `ways` has all `routes_needed`."""
    end_by = machine.end_by
    available = INFINITE if end_by is None else (end_by - clock) % DAY_S or DAY_S
    longest = max((way.length for way in ways.values() if way.exists), default=0.0)
    work = _Estimator(machine, mission, ways, clock, available, approaches(machine), longest)
    _region(work, machine.start[0], None, _Flow(FREE, FREE, Used(), 1.0, True))
    whole = _whole(work)
    for order in machine.orders:
        _order(work, order.entry[0])
    return Estimate(
        clock,
        tuple(work.steps[step] for step in sorted(work.steps)),
        replace(whole, seconds=whole.seconds.at_most(available)),
        whole,
        available,
        work.legs,
        tuple(work.drains.values()),
        assumptions(machine),
    )


def _order(work: _Estimator, entry: int) -> None:
    """The steps of a standing order, for one time, whenever that is. It has a battery of its own to reckon with."""
    ends, drains = work.ends, dict(work.drains)
    begins = Cost(seconds=Span(0.0, 0.0, work.available))
    _region(work, entry, None, _Flow(begins, FREE, Used(), 1.0, True))
    work.ends, work.drains = ends, drains


def _whole(work: _Estimator) -> Cost:
    """From the start to whichever end comes."""
    if not work.ends:
        return Cost(Span(INFINITE, INFINITE, INFINITE), UNKNOWN, UNKNOWN)
    return _joined([replace(end, base=FREE, cost=end.base.plus(end.cost)) for end in work.ends]).cost


# --- the way through the blocks -----------------------------------------------------------------------------------


def _region(work: _Estimator, entry: int, back: int | None, begin: _Flow) -> _Flow | None:
    """Go through the blocks from `entry` until `back` is come to again, or every end; the flow that comes back."""
    arriving: dict[int, list[_Flow]] = {entry: [begin]}
    waiting = [entry]
    while waiting:
        number = heapq.heappop(waiting)
        flow = _joined(arriving.pop(number))
        if not work.machine.blocks[number].exits and not work.machine.blocks[number].branches:
            _record(work, number, flow, FREE)
            if work.recording:
                work.ends.append(flow)
            continue
        for onward, after in _through(work, number, flow):
            if onward not in arriving:
                arriving[onward] = []
                if onward != back:
                    heapq.heappush(waiting, onward)
            arriving[onward].append(after)
    back_again = arriving.get(back) if back is not None else None
    return _joined(back_again) if back_again else None


def _joined(flows: list[_Flow]) -> _Flow:
    """Where ways join, least and likely are those of the ways that go as planned, if any does."""
    if len(flows) == 1:
        return flows[0]
    planned = [flow for flow in flows if flow.planned] or flows
    shares = [flow.share for flow in planned]
    cost = one_of([flow.cost for flow in planned], shares)
    most = one_of([flow.cost for flow in flows], [flow.share for flow in flows])
    cost = Cost(
        replace(cost.seconds, most=most.seconds.most),
        replace(cost.meters, most=most.meters.most),
        replace(cost.energy, most=most.energy.most),
    )
    used = _joined_used([flow.used for flow in planned])
    return _Flow(flows[0].base, cost, used, sum(shares), any(flow.planned for flow in flows))


def _joined_used(used: list[Used]) -> Used:
    return Used(
        one_of([Cost(energy=each.since) for each in used], [1.0] * len(used)).energy,
        one_of([Cost(energy=each.first) for each in used], [1.0] * len(used)).energy,
        all(each.charged for each in used),
    )


def _through(work: _Estimator, number: int, flow: _Flow) -> list[tuple[int, _Flow]]:
    """The blocks that follow, and what was spent up to each."""
    block = work.machine.blocks[number]
    exits = {exit_: to[0] for exit_, to in block.exits}
    if block.branches:
        cost, used = _visit(work, number, flow)
    elif Exit.BODY in exits and block.fragment != "when":
        cost, used = _loop(work, number, exits[Exit.BODY], flow)
    else:
        cost = _cost(work, number, flow)
        used = _used_after(work, block, flow.used.plus(cost.energy))
    _record(work, number, flow, cost)
    if not math.isfinite(cost.seconds.least):
        return []
    return list(_onward(exits, flow, cost, used, split=block.fragment == "when"))


def _onward(
    exits: Mapping[Exit, int], flow: _Flow, cost: Cost, used: Used, *, split: bool
) -> Iterable[tuple[int, _Flow]]:
    after = replace(flow, cost=flow.cost.plus(cost), used=used, share=flow.share * (0.5 if split else 1.0))
    if split:
        yield from ((exits[exit_], after) for exit_ in (Exit.BODY, Exit.NEXT) if exit_ in exits)
        return
    if Exit.NEXT in exits:
        yield exits[Exit.NEXT], after
    if Exit.FAILED in exits:
        yield exits[Exit.FAILED], replace(after, share=0.0, planned=False)


def _record(work: _Estimator, number: int, flow: _Flow, cost: Cost) -> None:
    step = work.machine.blocks[number].step
    if not work.recording or step is None:
        return
    made = StepEstimate(step, flow.begins.at_most(work.available), cost)
    if work.machine.blocks[number].place is not None:
        drive = drive_span(leg_lengths(work, number), work.machine.speed, work.mission.robot)
        work.legs[number] = replace(made, drive=drive)
    known = work.steps.get(step)
    work.steps[step] = made if known is None else replace(known, cost=known.cost.plus(cost))
    _note_drain(work, step, flow.used.plus(cost.energy))


def _note_drain(work: _Estimator, step: int, used: Used) -> None:
    """Note the first step at which the battery is empty at the least, and the first at which it likely is."""
    capacity = work.mission.robot.battery.capacity
    surely, likely = used.since.least > capacity, used.since.likely > capacity
    known = {drain.surely for drain in work.drains.values()}
    if (surely and True not in known) or (likely and not known):
        work.drains.setdefault(step, Drain(step, surely))
        if surely:
            work.drains[step] = Drain(step, True)


# --- single blocks ------------------------------------------------------------------------------------------------


def _cost(work: _Estimator, number: int, flow: _Flow) -> Cost:
    block = work.machine.blocks[number]
    fragment = work.machine.fragments[block.fragment]
    if block.place is not None:
        lengths = leg_lengths(work, number)
        return leg_cost(fragment, block.seconds, lengths, work.machine.speed, work.mission.robot)
    if block.fragment == "charge":
        return Cost(seconds=_charging(work, block, flow))
    return _standing(work, _waiting(work, block, flow))


def leg_lengths(work: _Estimator, number: int) -> Lengths:
    """The lengths of a leg, over all places it may begin at."""
    block, come_from = work.machine.blocks[number], work.approaches[number]
    assert block.place is not None, "asked only of legs"
    if block.relative:
        pose = work.machine.places[block.place].pose
        ahead = math.hypot(pose.x, pose.y)
        return Lengths(max(0.0, ahead - RELATIVE_SLACK_M), ahead, max(ahead, work.longest))
    ways = [work.ways.get((before, block.place)) for before in come_from.places if before != block.place]
    found = [way for way in ways if way is not None and way.exists]
    if not found:
        return Lengths(0.0, 0.0, work.longest)
    least = min(way.least for way in found) if come_from.sure and block.place not in come_from.places else 0.0
    return Lengths(least, sum(way.length for way in found) / len(found), work.longest)


def _standing(work: _Estimator, seconds: Span) -> Cost:
    idle = work.mission.robot.battery.idle / 3600.0
    return Cost(seconds=seconds, energy=seconds.each(lambda time: product(time, idle)))


def _waiting(work: _Estimator, block: Block, flow: _Flow) -> Span:
    """How long the robot stands for a wait, a question or a condition."""
    if block.answers:
        up_to = block.seconds or 0.0
        return Span(0.0, 0.5 * up_to, up_to + TICK_S)
    if block.condition is None or block.fragment == "when":
        time = block.seconds or 0.0
        return Span(time, time, time + TICK_S if time else 0.0)
    return watched(block, until_true(block.condition, _moment(work, flow)))


def _moment(work: _Estimator, flow: _Flow) -> Moment:
    battery = work.mission.robot.battery
    left = max(0.0, 1.0 - flow.used.since.likely / battery.capacity)
    return Moment(flow.begins, work.clock, battery=left, drain=battery.idle / 3600.0 / battery.capacity)


def _charging(work: _Estimator, block: Block, flow: _Flow) -> Span:
    battery = work.mission.robot.battery
    level = charge_level(block)
    if level is None:
        condition = block.condition
        assert condition is not None, "the compiler gives every charge its condition"
        return watched(block, until_true(condition, _moment(work, flow)))
    missing = Span(
        battery.capacity * level - battery.capacity + flow.used.since.least,
        battery.capacity * level - battery.capacity + flow.used.since.likely,
        battery.capacity * level,
    )
    if not work.recording:
        missing = replace(missing, least=0.0)
    return watched(
        block,
        missing.each(lambda energy: charging_seconds(battery, level - max(0.0, energy) / battery.capacity, level)),
    )


def _used_after(work: _Estimator, block: Block, used: Used) -> Used:
    """What was drawn since the battery was full, after a block; a charge gives back."""
    if not any(action.verb is Verb.CHARGE for action in work.machine.fragments[block.fragment].states[0].on_entry):
        return used
    level = charge_level(block)
    missing = 0.0 if level is None else (1.0 - level) * work.mission.robot.battery.capacity
    return Used(used.since.each(lambda drawn: min(drawn, missing)), used.first, True)


# --- blocks with blocks in them -----------------------------------------------------------------------------------


def _loop(work: _Estimator, number: int, body: int, flow: _Flow) -> tuple[Cost, Used]:
    block, idle = work.machine.blocks[number], work.mission.robot.battery.idle
    lap, used = _lap(work, number, body, flow)
    moment = replace(_moment(work, flow), drain=_drain_of(work, lap))
    cost = loop_cost(block, number, lap, moment, idle)
    left = work.available - flow.begins.likely
    if cost.seconds.likely > left:
        cost = _cut_short(cost, left)
    if work.recording:
        _region(work, body, number, flow.region(_only_most(cost)))
    if not used.charged:
        return cost, flow.used.plus(cost.energy)
    since = used.since.plus(used.first)
    if work.recording and block.step is not None:
        _note_drain(work, block.step, Used(since=since))
    return cost, Used(used.since, flow.used.first if flow.used.charged else flow.used.first.plus(used.first), True)


def _cut_short(cost: Cost, left: float) -> Cost:
    """What of a loop is likely before the end-by time ends it."""
    share = 0.0 if left <= 0.0 or math.isinf(cost.seconds.likely) else left / cost.seconds.likely
    return Cost(
        cost.seconds,
        replace(cost.meters, likely=product(cost.meters.likely, share)),
        replace(cost.energy, likely=product(cost.energy.likely, share)),
    )


def _drain_of(work: _Estimator, lap: Cost) -> float:
    if not 0.0 < lap.seconds.likely < INFINITE:
        return 0.0
    return lap.energy.likely / lap.seconds.likely / work.mission.robot.battery.capacity


def _lap(work: _Estimator, number: int, body: int, flow: _Flow) -> tuple[Cost, Used]:
    """One lap, whichever it is: begun at any time from the flow on."""
    if number not in work.laps:
        work.laps[number] = _unrecorded(work, number, [body], flow)
    return work.laps[number]


def _visit(work: _Estimator, number: int, flow: _Flow) -> tuple[Cost, Used]:
    """Every place once, in whatever order."""
    entries = [entry for entry, _ in work.machine.blocks[number].branches]
    if number not in work.laps:
        work.laps[number] = _unrecorded(work, number, entries, flow)
    cost, used = work.laps[number]
    if work.recording:
        before = flow.used
        for entry in entries:
            came_back = _region(work, entry, number, replace(flow.region(_only_most(cost)), used=before))
            before = came_back.used if came_back else before
    since = used.since if used.charged else flow.used.since.plus(cost.energy)
    first = flow.used.first if flow.used.charged else flow.used.first.plus(used.first)
    return cost, Used(since, first, flow.used.charged or used.charged)


def _unrecorded(work: _Estimator, back: int, entries: list[int], flow: _Flow) -> tuple[Cost, Used]:
    """What regions take one after the other, each begun at any time from the flow on; nothing is noted."""
    recording, work.recording = work.recording, False
    cost, used = FREE, Used()
    for entry in entries:
        begin = _Flow(flow.base.plus(flow.cost).plus(WHENEVER), FREE, used, 1.0, True)
        came_back = _region(work, entry, back, begin)
        cost = cost.plus(came_back.cost if came_back else NEVER_BACK)
        used = came_back.used if came_back else used
    work.recording = recording
    return cost, used


def _only_most(cost: Cost) -> Cost:
    """How much later than at the first time a lap may begin, and how much more may have been spent by then."""
    spans = (cost.seconds, cost.meters, cost.energy)
    return Cost(*(Span(0.0, 0.0, span.most) for span in spans))


NEVER_BACK = Cost(seconds=Span(INFINITE, INFINITE, INFINITE))
"""A lap that ends the mission."""

WHENEVER = Cost(seconds=Span(0.0, 0.0, INFINITE))
