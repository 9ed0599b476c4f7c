"""People on errands: they wait at a place for a while, then walk to another by the shortest way through open doors.

How they walk is in `kernels.crowd`; this decides where to. Everything random comes from the generator given.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.crowd import step
from backends.sim.kernels.errands import NOBODY, in_sight, next_due, pulled_straight
from backends.sim.kernels.weights import halved
from backends.sim.outline import Outline
from backends.sim.planner import find_halved
from backends.sim.world import World
from runner.site.values import CELL_M, Point, Site, Walkers

RADIUS_LEAST_M, RADIUS_MOST_M = 0.25, 0.35
"""Body radius, drawn evenly: 2r of 0.5 to 0.7 m (Helbing, Farkas and Vicsek, Nature 407, 2000)."""
SLOWEST_M_S = 0.4
"""Preferred speeds are drawn from a normal distribution and cut off here and at twice the mean."""
KEEP_OFF_M, KEEP_OFF_SOFT_M, KEEP_OFF_STRENGTH = 0.3, 0.8, 2.0
"""Weights of people's routes: clearance they need, clearance they like, and how much."""
STAY_MEAN_S = 30.0
"""Mean of the exponential time spent at a place."""
GATHER_M = 1.5
"""How far from a place people stand."""
PASS_M, ARRIVE_M = 0.5, 0.2
"""How near a bend, and the end, counts as there."""
PATIENCE_S = 6.0
"""After this long on the way to one bend a person looks for another way, or gives up."""
START_OFF_ROBOT_M = 1.0
ROBOT_BERTH_M = 0.9
"""Somebody stuck looks for a way that keeps this far from the robot's middle."""
ROUND_ROBOT_POINTS = 5
"""Such a way is walked by every so many of its points, 0.1 m apart, for in a straight line the robot would be in it."""


class People:
    """`bodies` has rows (x, y, radius), true now. The arrays are changed in place, tick by tick."""

    def __init__(
        self, groups: Sequence[Walkers], site: Site, world: World, robot: Point, generator: np.random.Generator
    ) -> None:
        """`robot` is where the robot stands, which nobody starts near. ValueError on a place that is not there."""
        self._world = world
        self._random = generator
        self._spots = [(place.pose.x, place.pose.y) for place in site.places]
        self._between = [_places_of(group, site) for group in groups for _ in range(group.count)]
        self._speeds = np.concatenate([np.empty(0), *(_speeds(group, generator) for group in groups)])
        count = len(self._between)
        self._routes: dict[tuple[int, int, frozenset[str]], NDArray[np.float64] | None] = {}
        self._ways: list[NDArray[np.float64]] = [np.empty((0, 2))] * count
        self._at = [self._draw(between) for between in self._between]
        self._from = list(self._at)
        self.bodies = np.zeros((count, 3))
        self.bodies[:, 2] = generator.uniform(RADIUS_LEAST_M, RADIUS_MOST_M, count)
        self.velocity = np.zeros((count, 2))
        self._target = np.zeros((count, 3))
        self._wished = np.zeros(count)
        self._wake = generator.uniform(0.0, STAY_MEAN_S, count)
        for one in range(count):
            self._put(one, robot)

    def advance(self, now: float, robot: NDArray[np.float64], outline: Outline, time: float) -> None:
        """Let everybody act for one tick that ends at `now`. `robot` is (x, y, heading)."""
        if not len(self.bodies):
            return
        step(
            self.bodies, self.velocity, self._target, self._wished, self._world.distance,
            outline.hull, outline.outer, robot, time,
        )  # fmt: skip
        one = next_due(0, self.bodies, self._target, self._wished, self._wake, now)
        while one != NOBODY:
            self._decide(one, now, robot)
            one = next_due(one + 1, self.bodies, self._target, self._wished, self._wake, now)

    def _draw(self, places: Sequence[int]) -> int:
        return places[int(self._random.integers(len(places)))]

    def _put(self, one: int, robot: Point) -> None:
        """Stand a person near a place and off the robot; after many tries, at whatever place was drawn last."""
        for _ in range(50):
            spot = self._spot_near(self._at[one], self.bodies[one, 2])
            if math.dist(spot, robot) >= START_OFF_ROBOT_M:
                break
            self._at[one] = self._draw(self._between[one])
        self.bodies[one, :2] = spot

    def _decide(self, one: int, now: float, robot: NDArray[np.float64]) -> None:
        if self._wished[one] == 0.0:
            self._set_off(one, now)
        elif now >= self._wake[one]:
            self._look_again(one, now, robot)
        elif len(self._ways[one]):
            self._next_bend(one, now)
        else:
            self._stay(one, now)

    def _set_off(self, one: int, now: float) -> None:
        """Draw a place to go to and walk there; where there is no way, stay a while longer."""
        start = self._at[one]
        others = [place for place in self._between[one] if place != start]
        if not others:
            self._stay(one, now)
            return
        goal = self._draw(others)
        self._from[one] = start
        self._walk(one, goal, self._route_between(start, goal), now)

    def _look_again(self, one: int, now: float, robot: NDArray[np.float64]) -> None:
        """Plan anew from here round the robot; where that leaves no way, turn back."""
        here = (float(self.bodies[one, 0]), float(self.bodies[one, 1]))
        goal, back = self._at[one], self._from[one]
        route = self._find(here, self._spots[goal], robot)
        if route is None:
            goal, route = back, self._find(here, self._spots[back], robot)
        self._walk(one, goal, route, now, ROUND_ROBOT_POINTS)

    def _walk(
        self, one: int, goal: int, route: NDArray[np.float64] | None, now: float, every: int | None = None
    ) -> None:
        """Walk a route: straight from bend to bend, or, with `every`, by every so many of its points."""
        if route is None:
            self._stay(one, now)
            return
        radius = float(self.bodies[one, 2])
        points = np.vstack([self.bodies[one : one + 1, :2], route, [self._spot_near(goal, radius)]])
        if every is None:
            self._ways[one] = points[pulled_straight(points, self._world.distance, radius)]
        else:
            self._ways[one] = np.vstack([points[every:-1:every], points[-1:]])
        self._at[one] = goal
        self._wished[one] = self._speeds[one]
        self._next_bend(one, now)

    def _next_bend(self, one: int, now: float) -> None:
        way = self._ways[one]
        self._target[one, :2] = way[0]
        self._target[one, 2] = PASS_M if len(way) > 1 else ARRIVE_M
        self._ways[one] = way[1:]
        walk = math.dist(way[0], self.bodies[one, :2]) / self._speeds[one]
        self._wake[one] = now + walk + PATIENCE_S

    def _stay(self, one: int, now: float) -> None:
        self._wished[one] = 0.0
        self._ways[one] = np.empty((0, 2))
        self._wake[one] = now + 1.0 + self._random.exponential(STAY_MEAN_S)

    def _spot_near(self, place: int, radius: float) -> Point:
        """A free spot to stand near a place, in sight of it; the place itself where none is found in 20 tries."""
        x, y = self._spots[place]
        for _ in range(20):
            away = GATHER_M * math.sqrt(self._random.uniform(0.1, 1.0))
            angle = self._random.uniform(0.0, 2.0 * math.pi)
            spot = (x + away * math.cos(angle), y + away * math.sin(angle))
            if in_sight(self._world.distance, x, y, spot[0], spot[1], radius):
                return spot
        return x, y

    def _route_between(self, start: int, goal: int) -> NDArray[np.float64] | None:
        """The way between two places while these doors are shut, remembered."""
        low, high = min(start, goal), max(start, goal)
        key = (low, high, self._world.shut)
        if key not in self._routes:
            self._routes[key] = self._find(self._spots[low], self._spots[high])
        route = self._routes[key]
        return route if route is None or start < goal else route[::-1]

    def _find(self, start: Point, goal: Point, robot: NDArray[np.float64] | None = None) -> NDArray[np.float64] | None:
        """The way over what is there now, doors included; with `robot`, round it."""
        weight = halved(self._world.distance, KEEP_OFF_M, KEEP_OFF_SOFT_M, KEEP_OFF_STRENGTH)
        if robot is not None:
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


def _places_of(group: Walkers, site: Site) -> Sequence[int]:
    """Indices of the places that a group walks between."""
    names = [place.name for place in site.places]
    if missing := [name for name in group.between if name not in names]:
        raise ValueError(f'People are to walk between places that the site does not have: "{missing[0]}".')
    if not names:
        raise ValueError("People need places to walk between, and the site has none.")
    return [names.index(name) for name in group.between or names]


def _speeds(group: Walkers, generator: np.random.Generator) -> NDArray[np.float64]:
    drawn = generator.normal(group.speed_mean, group.speed_deviation, group.count)
    return np.clip(drawn, SLOWEST_M_S, 2.0 * group.speed_mean)
