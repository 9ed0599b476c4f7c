"""From where the robot comes to each leg, found on the block graph before it moves.

Where the mission goes as planned (legs arrive, nobody skips) that is the place of the leg before, or one of several
where ways of the mission join. A leg that is only come to after a failure begins somewhere on the way of that one.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from runner.machine.table import Block, Exit, Machine

Places = frozenset[int | None]
"""Indices of `Machine.places`; None is the place where the mission starts, if no leg goes there."""

_AS_PLANNED = {Exit.NEXT, Exit.BODY, Exit.BRANCH}


@dataclass(frozen=True, slots=True)
class Approach:
    """`places` the robot may come from; `sure` unless it may stand elsewhere; `planned` if no leg need fail first."""

    places: Places
    sure: bool
    planned: bool


def approaches(machine: Machine) -> dict[int, Approach]:
    """For each block that can be reached, where the robot stands when it begins."""
    start = frozenset({machine.home})
    planned = _spread(machine, {machine.start[0]: (start, True)}, as_planned=True)
    seeds = {**planned, **{order.entry[0]: (start, False) for order in machine.orders}}
    everything = _spread(machine, seeds, as_planned=False, settled=frozenset(planned))
    return {
        number: Approach(places, sure and number in planned, number in planned)
        for number, (places, sure) in everything.items()
    }


Known = tuple[Places, bool]


def _spread(
    machine: Machine, seeds: dict[int, Known], *, as_planned: bool, settled: frozenset[int] = frozenset()
) -> dict[int, Known]:
    """Follow the exits until nothing new turns up; what is `settled` is passed on and not changed."""
    found = dict(seeds)
    waiting = list(seeds)
    while waiting:
        number = waiting.pop()
        block = machine.blocks[number]
        for exit_, onward in _onward(block):
            if (as_planned and exit_ not in _AS_PLANNED) or onward in settled:
                continue
            places, sure = _after(block, exit_, *found[number])
            before = found.get(onward)
            joined = (places, sure) if before is None else (places | before[0], sure and before[1])
            if joined != before:
                found[onward] = joined
                waiting.append(onward)
    return found


def _onward(block: Block) -> Iterator[tuple[Exit, int]]:
    yield from ((exit_, to[0]) for exit_, to in block.exits)
    yield from ((Exit.BRANCH, to[0]) for to in block.branches)


def _after(block: Block, exit_: Exit, places: Places, sure: bool) -> Known:
    if block.place is None:
        return places, sure
    if exit_ is not Exit.NEXT:
        return places | {block.place}, False
    return (places, False) if block.relative else (frozenset({block.place}), True)
