"""Walking to a place and getting there, or giving up: what all people have in common, whatever they are there for."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.footwork import Footwork
from backends.sim.wayfinding import Way, Wayfinding
from runner.site.values import Point

OUT_OF_SIGHT_M = 10.0
"""People come and go where the robot cannot see them: farther off than this, or behind something."""
LOOK_AGAIN_S = 5.0
SPOT_TRIES, ELBOW_M = 10, 1.0
"""Nobody begins to stand nearer than this to the middle of the robot."""
OFF_ROBOT_M = 3.0
"""Somebody who leaves goes to a place at least so far from the robot, if there is one."""


class Errands:
    """Sends people to places, and says when they are there."""

    def __init__(self, feet: Footwork, ways: Wayfinding, generator: np.random.Generator) -> None:
        count = len(feet.bodies)
        self.feet = feet
        self.ways = ways
        self.at = [0] * count
        """The place each is at or on the way to."""
        self._from = [0] * count
        self._random = generator

    def begin_at(self, one: int, place: int) -> None:
        """Take somebody to belong to a place from now on."""
        self.at[one] = self._from[one] = place

    def send(self, one: int, goal: int, now: float) -> bool:
        """Let somebody walk from the place they are at to another; False where there is no way."""
        start = self.at[one]
        route = self.ways.between(start, goal)
        if route is None:
            return False
        here, radius = self.feet.where(one), float(self.feet.bodies[one, 2])
        self._from[one], self.at[one] = start, goal
        self.feet.walk(one, self.ways.bends(here, route, self.ways.near(goal, radius), radius), now)
        return True

    def send_off(self, one: int, robot: NDArray[np.float64], now: float) -> None:
        """Let somebody walk away from anywhere, round the robot, to a place off it drawn at random."""
        spots = self.ways.spots
        off = [place for place, (x, y) in enumerate(spots) if math.hypot(x - robot[0], y - robot[1]) > OFF_ROBOT_M]
        goal = off[int(self._random.integers(len(off)))] if off else 0
        self.begin_at(one, goal)
        self._take(one, goal, self._round(one, goal, robot), now)

    def carry_on(self, one: int, now: float, robot: NDArray[np.float64]) -> bool:
        """Somebody who walks has come to a bend, or lost patience; True where the walk has ended."""
        if now >= self.feet.wake[one]:
            goal, back = self.at[one], self._from[one]
            way = self._round(one, goal, robot)
            if way is None:
                goal, way = back, self._round(one, back, robot)
            return not self._take(one, goal, way, now)
        return not self.feet.next_bend(one, now)

    def spot_off(self, place: int, one: int, robot: NDArray[np.float64]) -> Point | None:
        """A free spot near a place and off the robot; None where none is found in some tries."""
        for _ in range(SPOT_TRIES):
            spot = self.ways.near(place, float(self.feet.bodies[one, 2]))
            if math.hypot(spot[0] - robot[0], spot[1] - robot[1]) >= ELBOW_M:
                return spot
        return None

    def unseen(self, spot: Point, robot: NDArray[np.float64]) -> bool:
        """Whether the robot cannot see a spot."""
        return not self.ways.sees((float(robot[0]), float(robot[1])), spot, OUT_OF_SIGHT_M)

    def leave_floor(self, one: int, now: float, robot: NDArray[np.float64], back_at: float = math.inf) -> None:
        """Go home from here, or, while the robot could see that, stand a little longer."""
        if self.unseen(self.feet.where(one), robot):
            self.feet.vanish(one, back_at)
        else:
            self.feet.stand(one, now + LOOK_AGAIN_S)

    def _round(self, one: int, goal: int, robot: NDArray[np.float64]) -> Way | None:
        radius = float(self.feet.bodies[one, 2])
        return self.ways.round_robot(self.feet.where(one), self.ways.near(goal, radius), robot)

    def _take(self, one: int, goal: int, way: Way | None, now: float) -> bool:
        if way is None:
            self.feet.stand(one, now + LOOK_AGAIN_S)
            return False
        self.at[one] = goal
        self.feet.walk(one, way, now)
        return True
