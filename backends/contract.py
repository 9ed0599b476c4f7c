"""What any robot must offer, and nothing else: the one page that a backend and the program share.

A backend drives one robot. It is found by its entry point in the group `trundle.backends`, a callable that
takes a `Setup` and returns a `Backend`. It knows poses and floors (`runner.site`) and nothing of missions.

Rules that every backend keeps, and that the host relies on:
- Time is `clock.now()`, seconds since `open`, never falling. Every report carries the stamp of when it was true.
- `go` is idempotent by goal id: the same id again changes nothing. A new id replaces the goal under way, for which
  no further status comes. Ids count up within a run and never repeat.
- A goal ends exactly once, with `arrived`, `refused`, `no route`, `halted` or `failed`; then the robot stands still.
- `clear`, `replan`, `ease_back` and `relocate` carry an action id and are answered by one `ActionReport`. They may be
  asked for with or without a goal under way. A goal under way stays under way, and driving to it goes on afterwards.
- `halt` ends the goal and any action and stops the robot as fast as its limits allow. It is always legal.
- `reports(until)` returns as soon as there is news, or with an empty list at `until`. A simulator computes up to that
  moment; a link waits for it. Commands take effect at `clock.now()`.
- Same setup, same seed, same calls at the same times: same reports, to the bit (simulators).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from enum import Enum, StrEnum
from typing import Protocol, runtime_checkable

from runner.site.values import Conditions, Point, Pose, RobotDescription, Site


class Capability(Enum):
    """What a robot may be able to do beyond driving to a pose and halting."""

    CLEAR = "clear"
    REPLAN = "replan"
    EASE_BACK = "ease back"
    RELOCATE = "relocate"
    CHARGE = "charge"
    RELATIVE = "relative moves"


class BackendError(Exception):
    """The robot is not to be had, or not any more, in a sentence. Raised by `capabilities`, `open` and `reports`."""


@dataclass(frozen=True, slots=True)
class Line:
    """How a robot on a socket is reached. The files hold keys; the keys themselves are never passed on.

    `session` names the run to the robot: the same again after a restart of the same run, and never that of another.
    """

    address: str
    session: str = ""
    key_file: str = ""
    robot_key_file: str = ""
    insecure: bool = False
    """Plain text is allowed beyond this computer."""


@dataclass(frozen=True, slots=True)
class Setup:
    """Everything a backend is made from. A backend for a real robot ignores `conditions` and `seed`."""

    site: Site
    robot: RobotDescription
    start: Pose
    conditions: Conditions
    seed: int
    begins: datetime
    """Wall time at which a simulated run begins; local time of the site, without a zone."""
    line: Line | None = None
    """The way to a robot on a socket; None for a backend that needs none."""


@dataclass(frozen=True, slots=True)
class Goal:
    """A pose to drive to. `speed` caps the robot's own limit, m/s.

    With `relative` the pose is seen from where the robot stands when it accepts the goal (x ahead, y to the left), and
    the robot goes there by its odometry alone, with no map.
    """

    id: int
    pose: Pose
    speed: float
    relative: bool = False


class GoalStatus(Enum):
    """Where a goal stands. The last five end it."""

    ACCEPTED = "accepted"
    UNDER_WAY = "under way"
    ARRIVED = "arrived"
    REFUSED = "refused"
    NO_ROUTE = "no route"
    HALTED = "halted"
    FAILED = "failed"


@dataclass(frozen=True, slots=True)
class GoalReport:
    """The status of a goal changed. `reason` is a sentence where the status needs one."""

    stamp: float
    goal_id: int
    status: GoalStatus
    reason: str = ""


@dataclass(frozen=True, slots=True)
class ActionReport:
    """An action ended; `done` is False where the robot could not do it, with the reason."""

    stamp: float
    action_id: int
    done: bool
    reason: str = ""


@dataclass(frozen=True, slots=True)
class Telemetry:
    """What the robot believes and senses, some times a second.

    `spread` is the standard deviation of the believed position, meters. `remaining` is the length of the route
    still to drive to the goal, meters, None without a goal or before there is a route. `route` is that route from
    the robot to the goal and `route_number` counts the times it was planned anew. `driven` is the path length driven
    since `open`, meters. `battery` is a fraction, 0 to 1. `obstacles` are points of things sensed near the robot
    that its map does not know, in the site frame.
    """

    stamp: float
    pose: Pose
    spread: float
    speed: float
    turn_rate: float
    battery: float
    driven: float
    remaining: float | None
    route_number: int
    route: tuple[Point, ...]
    obstacles: tuple[Point, ...]


Report = GoalReport | ActionReport | Telemetry


class Cause(StrEnum):
    """Why a simulated robot really stands or gets on badly."""

    NOTHING = ""
    PERSON = "person in the way"
    CARTON = "carton in the way"
    DOOR = "door shut"
    FURNITURE = "furniture in the way"
    NARROW = "gap too narrow"
    GONE = "remembered obstacle that is gone"
    WEDGED = "up against something"
    WHEELS_STUCK = "wheels stuck"
    SLIP = "slip"
    STOPPED = "emergency stop"
    BLIND = "lidar blind"
    CARRIED = "carried"
    ASTRAY = "not where it believes"
    SILENT = "silent"
    BATTERY = "battery empty"


@dataclass(frozen=True, slots=True)
class Truth:
    """What really was the case in a simulated world. It is kept beside the record, to score by; nothing decides by it.

    `pose` is where the robot really was, `cause` why it stood or got on badly from then on, if it did.
    """

    stamp: float
    pose: Pose
    cause: Cause


class Clock(Protocol):
    """The time a run lives in."""

    @property
    def virtual(self) -> bool:
        """True where time jumps as the arithmetic allows, so that the host must set the pace."""

    def now(self) -> float:
        """Seconds since `open`."""

    def wall(self) -> datetime:
        """Local wall time of the site, for clock conditions only."""


class Backend(Protocol):
    """One robot. Every call returns at once, except `reports`."""

    @property
    def clock(self) -> Clock: ...

    @property
    def capabilities(self) -> frozenset[Capability]: ...

    def preparation(self) -> str:
        """What `open` is about to take time for, as a sentence for the person who waits; empty if nothing."""

    def open(self) -> None:
        """Make ready, before any other call. May take seconds the first time (compiling, connecting)."""

    def go(self, goal: Goal) -> None: ...

    def halt(self) -> None: ...

    def clear(self, action_id: int, radius: float) -> None:
        """Forget remembered obstacles within `radius` meters of the robot."""

    def replan(self, action_id: int) -> None:
        """Throw the route away and plan a new one from what is remembered now."""

    def ease_back(self, action_id: int, distance: float) -> None:
        """Drive straight backward by `distance` meters, slowly, as far as it is free."""

    def relocate(self, action_id: int, pose: Pose | None) -> None:
        """Find out anew where the robot is, near `pose` if given."""

    def charge(self) -> None:
        """Begin charging, where the robot stands at a charger."""

    def reports(self, until: float) -> Sequence[Report]: ...

    def close(self) -> None: ...


@runtime_checkable
class TellsTruth(Protocol):
    """What a backend may offer beside `Backend`: a simulator knows what really is the case."""

    def truths(self) -> Sequence[Truth]:
        """What became true since the last call: each change of the cause, and about once a second under way."""


@dataclass(frozen=True, slots=True)
class LineQuality:
    """How good the line to a robot is. `round_trip` is the median of the latest, `round_trip_worst` the longest of
    them, seconds, None before the first answer. `offset` is the robot's clock minus ours, seconds, known to within
    `offset_error`, None before the first answer. `answered` is the share of the latest beats that came back, 0 to 1.
    """

    round_trip: float | None
    round_trip_worst: float | None
    offset: float
    offset_error: float | None
    answered: float


@runtime_checkable
class OnALine(Protocol):
    """What a backend may offer beside `Backend`: a robot on a socket has a line that can be bad."""

    @property
    def quality(self) -> LineQuality: ...
