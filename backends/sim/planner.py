"""The way to the goal over what the robot believes: A* on map and memory for a disc of the inscribed radius.

The disc is optimistic: it can lead the robot into a gap that its whole outline does not pass. That is how robots get
stuck, and it is the follower's business to notice.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.grid import nearest_finite
from backends.sim.kernels.path import CLEAR, clearances, lengths, obstructed, point_at, smoothed
from backends.sim.kernels.weights import halved
from backends.sim.outline import Outline
from runner.site.floor import cell_of
from runner.site.routes import find_route
from runner.site.values import CELL_M, Point, Pose

SOFT_M = 0.3
"""Beyond the circumscribed radius, how much more clearance a route likes to have."""
STRENGTH = 8.0
"""How much dearer the tightest cell is than an open one."""
SMOOTH_POINTS = 3
"""A route is smoothed over so many of its points, 0.1 m apart, to each side."""
START_REACH_CELLS = 10
"""How far off its own cell (of 10 cm) a route may begin where that is too tight."""
STRAIGHT_STEP_M = 0.1
"""Between the points of a straight route."""
SLACK_M = 0.01
"""A route counts as obstructed where its clearance fell by more than this below what it needs."""


@dataclass(frozen=True, slots=True)
class Route:
    """`points` (n, 2) from where the robot stood to the goal, `along` the length up to each, `needs` the clearance
    that each needs to count as free."""

    points: NDArray[np.float64]
    along: NDArray[np.float64]
    needs: NDArray[np.float64]

    @property
    def length(self) -> float:
        return float(self.along[-1])

    def obstruction(self, field: NDArray[np.float32], covered: float) -> float | None:
        """How far along the route, from `covered` on, something now stands in its way; None where nothing does."""
        index = obstructed(self.points, self.along, field, covered, self.needs)
        return None if index == CLEAR else float(self.along[index])

    def part(self, covered: float, most: int) -> tuple[Point, ...]:
        """The route from `covered` to its end in at most `most` points."""
        first = int(np.searchsorted(self.along, covered, side="right"))
        rest = self.points[first:]
        every = max(1, -(-len(rest) // (most - 2)))
        points = [point_at(self.points, self.along, covered), *[(x, y) for x, y in rest[::every].tolist()]]
        end = (float(self.points[-1, 0]), float(self.points[-1, 1]))
        return tuple(points if points[-1] == end else [*points, end])


def find_halved(weight: NDArray[np.float32], start: Point, goal: Point) -> NDArray[np.float64] | None:
    """The cheapest route on weights by `kernels.weights.halved`, as points (n, 2); None where there is none."""
    row, column = _halved_cell(start)
    first = nearest_finite(weight, row, column, START_REACH_CELLS)
    found = find_route(weight, first, _halved_cell(goal))
    return None if found is None else (found.cells[:, ::-1].astype(np.float64) + 0.5) * (2.0 * CELL_M)


def _halved_cell(point: Point) -> tuple[int, int]:
    row, column = cell_of(point)
    return row // 2, column // 2


class Planner:
    """Plans for one robot."""

    def __init__(self, outline: Outline) -> None:
        self.clearance_needed = outline.inner + CELL_M
        """Distance between cell centers at which the disc fits: the radius, and half a cell at each end."""
        self._soft = outline.outer + SOFT_M

    def plan(self, field: NDArray[np.float32], start: Pose, goal: Pose) -> Route | None:
        """The route where there is one. `field` is the distance to the nearest known or remembered obstacle."""
        weight = halved(field, self.clearance_needed, self._soft, STRENGTH)
        inner = find_halved(weight, (start.x, start.y), (goal.x, goal.y))
        if inner is None:
            return None
        raw = np.vstack([(start.x, start.y), inner[1:-1], (goal.x, goal.y)])
        return self._route(smoothed(raw, field, self.clearance_needed, SMOOTH_POINTS), field)

    def straight(self, field: NDArray[np.float32], start: Pose, goal: Pose) -> Route:
        """The straight line to the goal, whatever stands there: a move seen from the robot asks for no planning."""
        ends = np.array([(start.x, start.y), (goal.x, goal.y)])
        count = 2 + int(np.hypot(*(ends[1] - ends[0])) / STRAIGHT_STEP_M)
        return self._route(np.linspace(ends[0], ends[1], count), field)

    def _route(self, points: NDArray[np.float64], field: NDArray[np.float32]) -> Route:
        needs = clearances(points, field, self.clearance_needed) - SLACK_M
        return Route(points, lengths(points), needs)

    def fits(self, field: NDArray[np.float32], pose: Pose) -> bool:
        """Whether the disc fits at a pose."""
        row, column = cell_of((pose.x, pose.y))
        on_floor = 0 <= row < field.shape[0] and 0 <= column < field.shape[1]
        return on_floor and bool(field[row, column] >= self.clearance_needed)
