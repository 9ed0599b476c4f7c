"""The engine's state: where the machine is and what its registers hold. A plain value; `advance` makes the next one."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from runner.engine.progress import Progress
from runner.engine.values import Seen
from runner.machine.table import Address, Ending, Event, Machine, Outcome, Register, Timer
from runner.site.values import Point

INFINITE = 1e18
"""Seconds that never come; a number that JSON can hold, since a state is kept in the record."""


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
    """A loop's registers. Clock times are seconds since the midnight before the run.

    `laps` begun; `entered` and, if it is timed, `ends` by the clock; `due` is the stamp at which the next lap begins.
    """

    laps: int = 0
    entered: float = 0.0
    ends: float = INFINITE
    due: float = 0.0


@dataclass(frozen=True, slots=True)
class Visiting:
    """A visit's registers: how often it was begun, the branches still to come, and the one under way."""

    begun: int = 0
    left: tuple[int, ...] = ()
    now: int | None = None


@dataclass(frozen=True, slots=True)
class Frame:
    """The return register of a hold: the place that was left, the seconds its timers still had to run, and since when
    its condition was watched."""

    address: Address
    timers: Mapping[Timer, float]
    since: float = 0.0


@dataclass(frozen=True, slots=True)
class Interrupted:
    """The return register of a standing order: the place, and the leg with its registers and its trouble."""

    order: int
    frame: Frame
    step: int | None
    registers: Mapping[Register, int]
    leg: Leg | None
    incident: Incident | None


@dataclass(frozen=True, slots=True)
class Lasting:
    """Since when a condition has held without a break; `acted` once it has had its effect, until it is false again."""

    since: float
    acted: bool = False


@dataclass(slots=True)
class EngineState:
    """Everything the engine knows. Mappings are never changed in place, so a shallow copy is a snapshot.

    `now` is the stamp of the last input. `clock` is the time of day at stamp 0, seconds since midnight; `began_clock`,
    `end_by` and the ends of loops are seconds since that same midnight. `goal` and `action` are ids under way at the
    robot, None if none is. `timers` hold stamps. `here` is the place last arrived at. `entered` is the stamp at which
    the present state was entered, `since` the clock when its step came there first, before any interruption; `met` is
    the register of the condition watched in it, `orders` those of the standing orders, by their number.
    """

    address: Address
    now: float = 0.0
    clock: float = 0.0
    began: float = 0.0
    began_clock: float = 0.0
    seed: int = 0
    end_by: float | None = None
    step: int | None = None
    entered: float = 0.0
    since: float = 0.0
    timers: Mapping[Timer, float] = field(default_factory=dict)
    registers: Mapping[Register, int] = field(default_factory=dict)
    loops: Mapping[int, Loop] = field(default_factory=dict)
    visits: Mapping[int, Visiting] = field(default_factory=dict)
    counts: Mapping[str, int] = field(default_factory=dict)
    answer: str = ""
    met: Lasting | None = None
    orders: Mapping[int, Lasting] = field(default_factory=dict)
    goal: int | None = None
    goals_sent: int = 0
    action: int | None = None
    actions_asked: int = 0
    progress: Progress | None = None
    seen: Seen | None = None
    here: int | None = None
    leg: Leg | None = None
    last_leg: Outcome | None = None
    legs: int = 0
    legs_arrived: int = 0
    legs_failed: int = 0
    incident: Incident | None = None
    incidents: int = 0
    held: Frame | None = None
    interrupted: Interrupted | None = None
    ended: Ending | None = None


def initial_state(machine: Machine) -> EngineState:
    """The state before the run begins."""
    return EngineState(address=machine.start, here=machine.home)
