"""Which way people walk: the shortest over the true floor through doors they can open, by places of the site."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.errands import in_sight, pulled_straight
from backends.sim.kernels.weights import halved
from backends.sim.planner import find_halved
from backends.sim.world import World
from runner.site.values import CELL_M, Point, Site

KEEP_OFF_M, KEEP_OFF_SOFT_M, KEEP_OFF_STRENGTH = 0.3, 0.8, 2.0
"""Weights of people's routes: clearance they need, clearance they like, and how much."""
GATHER_M = 1.5
"""How far from a place people stand."""
ROBOT_BERTH_M = 0.9
"""Somebody stuck looks for a way that keeps this far from the robot's middle."""
ROUND_ROBOT_POINTS = 5
"""Such a way is walked by every so many of its points, 0.1 m apart, for in a straight line the robot would be in it."""

Way = NDArray[np.float64]


class Wayfinding:
    """Ways between the places of a site. A place is its index in the site's list."""

    def __init__(self, site: Site, world: World, generator: np.random.Generator) -> None:
        self.spots: list[Point] = [(place.pose.x, place.pose.y) for place in site.places]
        self._world = world
        self._random = generator
        self._weight = np.empty((0, 0), dtype=np.float32)
        self._weighed = -1
        """At which change of the world the weights were worked out."""
        self._routes: dict[tuple[int, int, frozenset[str]], Way | None] = {}

    def between(self, start: int, goal: int) -> Way | None:
        """The way between two places while these doors are locked, remembered."""
        low, high = min(start, goal), max(start, goal)
        key = (low, high, self._world.shut - self._world.ajar)
        if key not in self._routes:
            self._routes[key] = self._find(self.spots[low], self.spots[high])
        route = self._routes[key]
        return route if route is None or start < goal else route[::-1]

    def bends(self, here: Point, route: Way, end: Point, radius: float) -> Way:
        """A route from where somebody stands, as the points at which it has to bend."""
        points: Way = np.vstack([[here], route, [end]])
        bent: Way = points[pulled_straight(points, self._world.walkable, radius)]
        return bent

    def round_robot(self, here: Point, end: Point, robot: NDArray[np.float64]) -> Way | None:
        """The way over what is there now, round the robot."""
        route = self._find(here, end, robot)
        if route is None:
            return None
        points = np.vstack([[here], route, [end]])
        return np.vstack([points[ROUND_ROBOT_POINTS:-1:ROUND_ROBOT_POINTS], points[-1:]])

    def straight_or_round(self, here: Point, end: Point, radius: float) -> Way | None:
        """The way over what is there now, through where the robot is if need be."""
        if in_sight(self._world.walkable, here[0], here[1], end[0], end[1], radius):
            return np.array([end])
        route = self._find(here, end)
        return None if route is None else self.bends(here, route, end, radius)

    def near(self, place: int, radius: float) -> Point:
        """A free spot to stand near a place, in sight of it; the place itself where none is found in 20 tries."""
        x, y = self.spots[place]
        for _ in range(20):
            away = GATHER_M * math.sqrt(self._random.uniform(0.1, 1.0))
            angle = self._random.uniform(0.0, 2.0 * math.pi)
            spot = (x + away * math.cos(angle), y + away * math.sin(angle))
            if in_sight(self._world.distance, x, y, spot[0], spot[1], radius):
                return spot
        return x, y

    def sees(self, here: Point, there: Point, farthest: float) -> bool:
        """Whether two points are in sight of each other and no farther apart than that."""
        return math.dist(here, there) <= farthest and bool(
            in_sight(self._world.distance, here[0], here[1], there[0], there[1], CELL_M)
        )

    def _find(self, start: Point, goal: Point, robot: NDArray[np.float64] | None = None) -> Way | None:
        if self._weighed != self._world.changes:
            self._weighed = self._world.changes
            self._weight = halved(self._world.walkable, KEEP_OFF_M, KEEP_OFF_SOFT_M, KEEP_OFF_STRENGTH)
        weight = self._weight
        if robot is not None:
            weight = weight.copy()
            _close_around(weight, float(robot[0]), float(robot[1]))
        return find_halved(weight, start, goal)


def _close_around(weight: NDArray[np.float32], x: float, y: float) -> None:
    """Make a disc around the robot impassable."""
    row, column = int(y / CELL_M) // 2, int(x / CELL_M) // 2
    reach = round(ROBOT_BERTH_M / CELL_M / 2.0)
    rows = slice(max(row - reach, 0), row + reach + 1)
    columns = slice(max(column - reach, 0), column + reach + 1)
    part = weight[rows, columns]
    off = np.hypot(
        np.arange(rows.start, rows.start + part.shape[0])[:, None] - row,
        np.arange(columns.start, columns.start + part.shape[1])[None, :] - column,
    )
    part[off <= reach] = np.inf
