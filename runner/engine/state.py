"""The engine's state: where the machine is and what its registers hold. A plain value; `advance` makes the next one."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from runner.engine.progress import Progress
from runner.engine.values import Seen
from runner.machine.table import Address, Ending, Event, Machine, Register, Timer
from runner.site.values import Point


@dataclass(frozen=True, slots=True)
class Leg:
    """The leg under way; `driven` is the robot's odometer when it began, meters."""

    number: int
    step: int
    place: str
    began: float
    driven: float


@dataclass(frozen=True, slots=True)
class Incident:
    """The trouble under way. `obstacles` are those sensed when it began; `helper` is what was tried last."""

    number: int
    leg: int
    began: float
    sign: Event
    detail: str
    obstacles: tuple[Point, ...]
    attempts: int = 0
    helper: str = ""


@dataclass(frozen=True, slots=True)
class Loop:
    """A loop's registers: laps begun; the clock (seconds since the first midnight) at which it ends, if timed."""

    laps: int = 0
    ends: float = float("inf")


@dataclass(frozen=True, slots=True)
class Frame:
    """The return register: the place an interruption left, and the seconds its timers still had to run."""

    address: Address
    timers: Mapping[Timer, float]


@dataclass(slots=True)
class EngineState:
    """Everything the engine knows. Mappings are never changed in place, so a shallow copy is a snapshot.

    `clock` is the time of day at stamp 0, seconds since midnight; `end_by` and loop ends are seconds since that same
    midnight. `goal` and `action` are ids under way at the robot, None if none is. `timers` hold stamps.
    """

    address: Address
    clock: float = 0.0
    end_by: float | None = None
    step: int | None = None
    timers: Mapping[Timer, float] = field(default_factory=dict)
    registers: Mapping[Register, int] = field(default_factory=dict)
    loops: Mapping[int, Loop] = field(default_factory=dict)
    goal: int | None = None
    goals_sent: int = 0
    action: int | None = None
    actions_asked: int = 0
    progress: Progress | None = None
    seen: Seen | None = None
    leg: Leg | None = None
    legs: int = 0
    legs_arrived: int = 0
    legs_failed: int = 0
    incident: Incident | None = None
    incidents: int = 0
    held: Frame | None = None
    ended: Ending | None = None


def initial_state(machine: Machine) -> EngineState:
    """The state before the run begins."""
    return EngineState(address=machine.start)


def next_deadline(state: EngineState) -> float | None:
    """The stamp at which the engine wants a Tick, if nothing happens before; None if it waits for events alone."""
    if state.ended is not None:
        return None
    deadlines = list(state.timers.values())
    if state.end_by is not None:
        deadlines.append(state.end_by - state.clock)
    return min(deadlines, default=None)
