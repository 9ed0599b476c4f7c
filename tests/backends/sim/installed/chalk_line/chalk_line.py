"""What somebody else might install beside Trundle: a planner that draws one bend, and a follower that plods along it.

It imports `backends.sim.parts`, and the types that its two makers are called with.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.drive import Drive
from backends.sim.outline import Outline
from backends.sim.parts import STAND, Way, Wish
from runner.site.values import CELL_M, Point, Pose

STEP_M = 0.1
SLOW = 0.3
NEAR_M, NEARLY = 0.1, 0.06


class Chalk:
    """Draws the way along x first and then along y, whatever stands there."""

    def __init__(self, outline: Outline, known: NDArray[np.float32]) -> None:
        self._needs = outline.inner
        self._known = known

    def find(self, field: NDArray[np.float32], start: Point, goal: Point) -> NDArray[np.float64] | None:
        """None where the goal is too near to something."""
        if min(_clearance(field, goal), _clearance(self._known, goal)) < self._needs:
            return None
        bend = (goal[0], start[1])
        return np.vstack([_line(start, bend), _line(bend, goal)[1:], [goal]])


class Plodder:
    """Turns until it points at a spot ahead on the way, then goes there, slowly."""

    def __init__(self, outline: Outline, drive: Drive) -> None:
        self._needs = outline.inner
        self._fastest = min(SLOW, drive.limits.speed)
        self.routes = 0

    def begin(self) -> None:
        """Count the routes."""
        self.routes += 1

    def steer(
        self, field: NDArray[np.float32], way: Way, covered: float, pose: Pose, goal: Pose, fastest: float
    ) -> Wish:
        """At the goal it turns to the goal's heading."""
        if math.hypot(goal.x - pose.x, goal.y - pose.y) < NEAR_M:
            off = _off(goal.heading, pose)
            return Wish(0.0, 0.0, arrived=True) if abs(off) < NEARLY else Wish(0.0, off)
        x, y = way.points[min(int(np.searchsorted(way.along, covered + 0.3)), len(way.points) - 1)].tolist()
        off = _off(math.atan2(y - pose.y, x - pose.x), pose)
        if _clearance(field, (x, y)) < self._needs:
            return STAND
        return Wish(0.0, off) if abs(off) > 0.3 else Wish(min(self._fastest, fastest), off)


def _clearance(field: NDArray[np.float32], at: Point) -> float:
    return float(field[int(at[1] / CELL_M), int(at[0] / CELL_M)])


def _off(heading: float, pose: Pose) -> float:
    return math.remainder(heading - pose.heading, 2.0 * math.pi)


def _line(start: Point, end: Point) -> NDArray[np.float64]:
    return np.linspace(start, end, 2 + int(math.dist(start, end) / STEP_M))
