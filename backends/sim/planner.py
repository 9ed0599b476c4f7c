"""The way to the goal over what the robot believes: A* on map and memory for a disc of the inscribed radius.

The disc is optimistic: it can lead the robot into a gap that its whole outline does not pass. That is how robots get
stuck, and it is the follower's business to notice. `DiscSearch` is the part that others may replace (`parts`);
`Planner` makes routes of what it finds.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.grid import nearest_finite
from backends.sim.kernels.path import CLEAR, clearances, lengths, obstructed, point_at, smoothed
from backends.sim.kernels.weights import halved
from backends.sim.outline import Outline
from backends.sim.parts import PlannerPart
from runner.site.floor import cell_of
from runner.site.routes import NOTHING_KNOWN, costs_ahead, find_route, is_joined
from runner.site.values import CELL_M, Point, Pose

SOFT_M = 0.3
"""Beyond the circumscribed radius, how much more clearance a route likes to have."""
STRENGTH = 8.0
"""How much dearer the tightest cell is than an open one."""
WORTH_KNOWING, GOALS_KNOWN = 4, 32
"""A goal planned for so often is worth knowing what the map says of the way to it, for so many goals at most."""
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


def find_halved(
    weight: NDArray[np.float32], start: Point, goal: Point, ahead: NDArray[np.float32] = NOTHING_KNOWN
) -> NDArray[np.float64] | None:
    """The cheapest route on weights by `kernels.weights.halved`, as points (n, 2); None where there is none."""
    first, last = start_cell(weight, start), _halved_cell(goal)
    found = find_route(weight, first, last, ahead) if is_joined(weight, first, last) else None
    return None if found is None else (found.cells[:, ::-1].astype(np.float64) + 0.5) * (2.0 * CELL_M)


def start_cell(weight: NDArray[np.float32], start: Point) -> tuple[int, int]:
    """The open cell that a route from a point begins in; (-1, -1) where none is near."""
    row, column = _halved_cell(start)
    first, second = nearest_finite(weight, row, column, START_REACH_CELLS)
    return int(first), int(second)


def _halved_cell(point: Point) -> tuple[int, int]:
    row, column = cell_of(point)
    return row // 2, column // 2


class DiscSearch:
    """Finds the cheapest way for a disc of the inscribed radius that likes to keep off walls."""

    def __init__(self, outline: Outline, known: NDArray[np.float32]) -> None:
        self._hard, self._soft = outline.inner + CELL_M, outline.outer + SOFT_M
        self._known = known
        self._asked: dict[tuple[int, int], int] = {}
        self._ahead: dict[tuple[int, int], NDArray[np.float32]] = {}

    def find(self, field: NDArray[np.float32], start: Point, goal: Point) -> NDArray[np.float64] | None:
        weight = self.weight(field)
        inner = find_halved(weight, start, goal, self._costs_ahead(_halved_cell(goal)))
        return (
            None if inner is None else smoothed(np.vstack([start, inner[1:-1], goal]), field, self._hard, SMOOTH_POINTS)
        )

    def weight(self, field: NDArray[np.float32]) -> NDArray[np.float32]:
        """Weights on every second cell."""
        weight: NDArray[np.float32] = halved(field, self._hard, self._soft, STRENGTH)
        return weight

    def _costs_ahead(self, goal: tuple[int, int]) -> NDArray[np.float32]:
        """What the map alone says of the way to a goal that is asked for often. What is remembered only adds to it."""
        asked = self._asked[goal] = self._asked.get(goal, 0) + 1
        if asked < WORTH_KNOWING:
            return NOTHING_KNOWN
        if goal not in self._ahead:
            if len(self._ahead) >= GOALS_KNOWN:
                del self._ahead[next(iter(self._ahead))]
            self._ahead[goal] = costs_ahead(self.weight(self._known), goal)
        return self._ahead[goal]


class Planner:
    """Plans for one robot with the part given."""

    def __init__(self, outline: Outline, part: PlannerPart) -> None:
        self._part = part
        self.clearance_needed = outline.inner + CELL_M
        """Distance between cell centers at which the disc fits: the radius, and half a cell at each end."""

    def plan(self, field: NDArray[np.float32], start: Pose, goal: Pose) -> Route | None:
        """The route where there is one. `field` is the distance to the nearest known or remembered obstacle."""
        points = self._part.find(field, (start.x, start.y), (goal.x, goal.y))
        return None if points is None else self._route(points, field)

    def is_joined(self, field: NDArray[np.float32], start: Pose, goal: Pose) -> bool:
        """Whether the disc gets from one pose to another at all."""
        weight = halved(field, self.clearance_needed, self.clearance_needed + CELL_M, 0.0)
        return is_joined(weight, start_cell(weight, (start.x, start.y)), _halved_cell((goal.x, goal.y)))

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
