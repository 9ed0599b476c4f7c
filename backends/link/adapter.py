"""What an adapter fills in: six methods between the link and one robot.

All of them are called from one thread and return at once. The link does everything else: the lease, repeated and late
commands, goals that are not to be driven twice, and stopping the robot when its controller is silent.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import Enum
from typing import Protocol

from backends.contract import Telemetry
from runner.site.values import Pose


@dataclass(frozen=True, slots=True)
class Robot:
    """What an adapter says about its robot. `abilities` are words of PROTOCOL.md, section 4.

    `silence`: seconds without a sign of life from the controller after which the robot is stopped. `term`: seconds
    after which that controller's lease ends. `speed`: the fastest it drives, m/s. `site`: the name of the site its map
    shows, empty where it does not know one. `pace` and `begins` are for simulated robots only.
    """

    name: str
    abilities: frozenset[str]
    speed: float
    silence: float = 1.0
    term: float = 30.0
    site: str = ""
    pace: float = 1.0
    begins: str = ""


@dataclass(frozen=True, slots=True)
class Drive:
    """Drive to `pose` (site frame) at no more than `speed`, m/s. `id` counts up and is for this adapter only.

    With `relative`, the pose is in the robot's own frame where it stands now (x ahead, y to the left), and the robot
    goes there by its odometry alone. Only robots with the ability "relative moves" are asked for that.
    """

    id: int
    pose: Pose
    speed: float
    relative: bool = False


class Doing(Enum):
    """What a robot can be asked to do besides driving to a pose and stopping."""

    CLEAR = "clear"
    REPLAN = "replan"
    EASE_BACK = "ease back"
    RELOCATE = "relocate"
    CHARGE = "charge"


@dataclass(frozen=True, slots=True)
class Task:
    """Do something: `amount` is a radius or a distance in meters, `pose` a hint. A charge has id 0 and no answer."""

    id: int
    doing: Doing
    amount: float = 0.0
    pose: Pose | None = None


class Standing(Enum):
    """What became of a drive; all but the first end it, and then the robot stands."""

    UNDER_WAY = "under way"
    ARRIVED = "arrived"
    REFUSED = "refused"
    NO_ROUTE = "no route"
    HALTED = "halted"
    FAILED = "failed"


@dataclass(frozen=True, slots=True)
class DriveNews:
    """A drive began to move, or ended."""

    id: int
    standing: Standing
    reason: str = ""


@dataclass(frozen=True, slots=True)
class TaskNews:
    """A task ended."""

    id: int
    done: bool
    reason: str = ""


News = DriveNews | TaskNews


class Adapter(Protocol):
    """One robot, as the link needs it."""

    def describe(self) -> Robot:
        """Who the robot is and what it can do."""

    def drive(self, drive: Drive) -> None:
        """Begin a drive, in place of the one under way, of which nothing more need be said."""

    def stop(self) -> None:
        """End the drive and all tasks, and stand still as soon as the robot's limits allow. Always legal."""

    def start(self, task: Task) -> None:
        """Begin a task. A drive under way goes on afterwards."""

    def look(self) -> Telemetry:
        """What the robot believes and senses now. Its stamp is of the clock that the link was given."""

    def news(self) -> Sequence[News]:
        """What began and ended since the last call, in order."""
