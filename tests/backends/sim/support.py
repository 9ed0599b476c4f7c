"""Small worlds to try the simulated robot in, and what to ask of a run."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field, replace
from datetime import datetime
from typing import Any

from backends.contract import ActionReport, Goal, GoalReport, GoalStatus, Report, Setup, Telemetry
from backends.sim.simulator import Simulator
from runner.site.values import (
    Battery,
    Carton,
    Conditions,
    Door,
    DoorChange,
    Lidar,
    Place,
    Pose,
    RobotDescription,
    Site,
    Solid,
    Walkers,
    Wall,
)

QUIET = Conditions("test", 0.0)
EVENING = datetime(2026, 1, 5, 18, 0)

CART = RobotDescription(
    name="cart",
    footprint=((0.35, 0.25), (-0.35, 0.25), (-0.35, -0.25), (0.35, -0.25)),
    speed=0.8,
    reverse_speed=0.3,
    acceleration=0.5,
    turn_speed=1.2,
    turn_acceleration=2.0,
    lidar=Lidar(math.radians(270.0), 181, 10.0, 10.0, 0.02, 0.2),
    battery=Battery(500.0, 20.0, 80.0, 200.0),
)


def box(width: float, height: float) -> Wall:
    """The outer walls of a floor."""
    return Wall(((0.0, 0.0), (width, 0.0), (width, height), (0.0, height), (0.0, 0.0)), 0.2)


HALL = Site("hall", 12.0, 8.0, (box(12.0, 8.0),), (), (), (Place("west", Pose(2, 4, 0)), Place("east", Pose(10, 4, 0))))
"""One empty room."""

CORRIDOR = Site(
    "corridor", 40.0, 4.0,
    (box(40.0, 4.0), Wall(((0.0, 1.0), (40.0, 1.0)), 0.2), Wall(((0.0, 3.0), (40.0, 3.0)), 0.2)),
    (), (), (Place("west", Pose(2, 2, 0)), Place("east", Pose(38, 2, 0))),
)  # fmt: skip
"""A corridor 40 m long and 1.8 m wide: the only way from west to east."""

TWO_ROOMS = Site(
    "two rooms", 14.0, 9.0,
    (box(14.0, 9.0), Wall(((7.0, 0.0), (7.0, 9.0)), 0.1)),
    (Solid(((2.0, 6.5), (4.0, 6.5), (4.0, 7.5), (2.0, 7.5))),),
    (Door("south door", (7.0, 1.5), (7.0, 2.7), 0.1), Door("north door", (7.0, 6.5), (7.0, 7.7), 0.1)),
    (Place("west", Pose(2, 2, 0)), Place("middle", Pose(4.5, 4.5, 0)), Place("east", Pose(12, 2, math.pi / 2)),
     Place("north", Pose(12, 7, math.pi))),
)  # fmt: skip
"""Two rooms with two doors between them."""


@dataclass
class Drive:
    """A simulator and all that it reported."""

    simulator: Simulator
    reports: list[Report] = field(default_factory=list)

    def until(self, seconds: float, ends: Callable[[Report], bool] = lambda _: False) -> Report | None:
        """Run up to a time, or to the first report of which `ends` is true, which is returned."""
        while self.simulator.clock.now() < seconds:
            for report in self.simulator.reports(seconds):
                self.reports.append(report)
                if ends(report):
                    return report
        return None

    def until_end(self, seconds: float) -> GoalReport | None:
        """Run until a goal ends."""
        report = self.until(seconds, is_end)
        return report if isinstance(report, GoalReport) else None

    def until_answer(self, action_id: int, seconds: float) -> ActionReport | None:
        """Run until an action is answered."""
        report = self.until(seconds, lambda one: isinstance(one, ActionReport) and one.action_id == action_id)
        return report if isinstance(report, ActionReport) else None

    def telemetry(self) -> list[Telemetry]:
        return [report for report in self.reports if isinstance(report, Telemetry)]

    def statuses(self) -> list[GoalStatus]:
        return [report.status for report in self.reports if isinstance(report, GoalReport)]


ENDS = {GoalStatus.ARRIVED, GoalStatus.REFUSED, GoalStatus.NO_ROUTE, GoalStatus.HALTED, GoalStatus.FAILED}


def is_end(report: Report) -> bool:
    """Whether a report ends a goal."""
    return isinstance(report, GoalReport) and report.status in ENDS


def start(
    site: Site,
    at: Pose,
    *,
    seed: int = 1,
    cartons: Iterable[Carton] = (),
    doors: Iterable[DoorChange] = (),
    walkers: Sequence[Walkers] = (),
    robot: RobotDescription = CART,
    begins: datetime = EVENING,
    conditions: Conditions = QUIET,
) -> Drive:
    """A robot standing at a pose, its clock at 0. The cartons, doors and walkers take the place of the conditions'."""
    given: dict[str, Any] = {"cartons": tuple(cartons), "doors": tuple(doors), "walkers": tuple(walkers)}
    conditions = replace(conditions, **{key: value for key, value in given.items() if value})
    return Drive(Simulator(Setup(site, robot, at, conditions, seed, begins)))


def go(drive: Drive, number: int, pose: Pose, speed: float = 0.8) -> None:
    """Send a goal."""
    drive.simulator.go(Goal(number, pose, speed))


def distance(one: Pose, other: Pose) -> float:
    """Meters between two poses."""
    return math.hypot(one.x - other.x, one.y - other.y)
