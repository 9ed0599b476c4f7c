"""One call of the engine in the making: a working copy of the state, the effects so far, and the time.

Both the interpreter (`advance`) and the actions work on it. It looks things up in the machine and changes nothing
but its own copy.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from runner.engine.state import EngineState
from runner.engine.values import Effect
from runner.machine.table import Block, Fragment, Machine, State, Timer
from runner.site.values import DAY_S


class EngineError(Exception):
    """The table and the engine disagree: a fault of ours, never of the user."""


@dataclass(slots=True)
class Draft:
    """`stamp` is the time at which what is being worked on happened."""

    machine: Machine
    state: EngineState
    stamp: float
    effects: list[Effect] = field(default_factory=list)

    def block(self) -> Block:
        return self.machine.blocks[self.state.address[0]]

    def fragment(self) -> Fragment:
        return self.machine.fragments[self.block().fragment]

    def local(self) -> State:
        return self.fragment().states[self.state.address[1]]

    def clock(self) -> float:
        """The time by the clock, seconds since the midnight before the run."""
        return self.stamp + self.state.clock

    def driven(self) -> float:
        """The robot's odometer, meters."""
        return self.state.seen.driven if self.state.seen else 0.0


def without(timers: Mapping[Timer, float], timer: Timer | None) -> Mapping[Timer, float]:
    """The timers, with that one stopped."""
    return {name: deadline for name, deadline in timers.items() if name is not timer} if timer in timers else timers


def next_clock(clock: float, now: float) -> float:
    """The next time after `now` (seconds since some midnight) at which the clock shows `clock`."""
    wait = (clock - now) % DAY_S
    return now + (wait if wait > 0.0 else DAY_S)
