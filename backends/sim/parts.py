"""The parts of the robot's own program that others may replace: what finds a route, and what follows it.

A part is installed beside Trundle under the entry point group `trundle.planners` or `trundle.followers`; the robot's
file names it. Both built-in ones are found the same way.

    [project.entry-points."trundle.planners"]
    my-planner = "my_package:make"

`make` is called once a robot: a planner's with a `Shape` and the map, a follower's with a `Shape` and the drive.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Any, Protocol, cast

import numpy as np
from numpy.typing import NDArray

from runner.site.values import Point, Pose

if TYPE_CHECKING:
    from backends.sim.drive import Drive
    from backends.sim.outline import Outline

PLANNERS, FOLLOWERS = "trundle.planners", "trundle.followers"


@dataclass(frozen=True, slots=True)
class Wish:
    """Speeds asked of the drive, ahead and to the left in m/s, and rad/s; `arrived` where it stands at the goal."""

    speed: float
    turn: float
    arrived: bool = False
    side: float = 0.0


STAND = Wish(0.0, 0.0)


class Way(Protocol):
    """A route as a follower gets it."""

    @property
    def points(self) -> NDArray[np.float64]:
        """Points (n, 2) in the site frame, meters."""

    @property
    def along(self) -> NDArray[np.float64]:
        """The length up to each of the points, meters."""

    @property
    def length(self) -> float:
        """Meters."""


class PlannerPart(Protocol):
    """Finds routes over what the robot believes."""

    def find(self, field: NDArray[np.float32], start: Point, goal: Point) -> NDArray[np.float64] | None:
        """Points (n, 2) of a route from start to goal, both included, about 0.1 m apart; None where there is none.

        `field` is a raster of cells of 5 cm, row 0 at the bottom: meters to the nearest known or remembered obstacle,
        0 in it. Called whenever a new route is wanted.
        """


class FollowerPart(Protocol):
    """Says what speeds to ask of the drive, ten times a second."""

    def begin(self) -> None:
        """There is a new route; the robot is at its start."""

    def steer(
        self, field: NDArray[np.float32], way: Way, covered: float, pose: Pose, goal: Pose, fastest: float
    ) -> Wish:
        """What to do now. `covered` is how far along the way the robot is; `fastest` caps the drive's own limit."""


MakePlanner = Callable[["Outline", NDArray[np.float32]], PlannerPart]
"""From the robot's outline and the map, as a `field` of it alone."""
MakeFollower = Callable[["Outline", "Drive"], FollowerPart]
"""From the robot's outline and its drive, whose speeds now can be read."""


def planner_named(name: str) -> MakePlanner:
    """What makes that planner. ValueError, with a sentence, where none of that name is installed."""
    return cast(MakePlanner, _part(PLANNERS, "planner", name))


def follower_named(name: str) -> MakeFollower:
    """What makes that follower. ValueError, with a sentence, where none of that name is installed."""
    return cast(MakeFollower, _part(FOLLOWERS, "follower", name))


def _part(group: str, what: str, name: str) -> Any:
    parts = _installed(group)
    if name not in parts:
        there = ", ".join(sorted(parts))
        raise ValueError(f'The robot asks for a {what} called "{name}". Installed are: {there or "none"}.')
    try:
        return parts[name].load()
    except Exception as error:
        raise ValueError(f'The {what} "{name}" cannot be loaded: {type(error).__name__}: {error}.') from error


@cache
def _installed(group: str) -> dict[str, Any]:
    from importlib.metadata import entry_points

    return {found.name: found for found in entry_points(group=group)}
