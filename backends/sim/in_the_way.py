"""What really stands in the way of a robot: the first on the points of its way, told from what its map knows."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.contract import Cause
from backends.sim.kernels.overlap import covers_solid, gap
from backends.sim.memory import Memory
from backends.sim.outline import Outline
from backends.sim.world import World
from runner.site.values import CELL_M, Pose

ELBOW_M = 0.2
"""A person this near to where the robot's disc would pass is in the way."""
PEOPLE_WITHIN_M = 7.0
"""People farther from the robot than this are not in its way yet."""
ASIDE_M, TURNED = (0.0, 0.08, -0.08, 0.15, -0.15), tuple(math.radians(turn) for turn in (0, 15, -15, 30, -30))
"""A gap is too narrow where the robot fits nowhere so far beside the middle of its way, turned by so much."""
CAUSES = {"door": Cause.DOOR, "carton": Cause.CARTON, "solid": Cause.FURNITURE}

Points = NDArray[np.float64]


def first_in_the_way(
    points: Points, robot: Pose, outline: Outline, world: World, memory: Memory, people: NDArray[np.float64]
) -> Cause:
    """A person, or what the outline would overlap, that comes first on the points of a way (n, 2); else something that
    the memory has there and that is gone; else a gap that is too narrow on the map; else nothing.

    `people` has rows (x, y, radius).
    """
    narrow = False
    person = _first_person(points, robot, outline.inner, people)
    for index in np.flatnonzero(_near_any(points, world.distance, outline.outer + CELL_M)).tolist():
        if index >= min(person, len(points) - 1):
            break
        x, y = points[index].tolist()
        heading = math.atan2(points[index + 1, 1] - y, points[index + 1, 0] - x)
        if covers_solid(world.blocked, outline.hull, x, y, heading):
            cells = _covered(outline, Pose(x, y, heading), world.blocked)
            unknown = cells[memory.known[cells[:, 0], cells[:, 1]] > 0.0]
            if len(unknown):
                return CAUSES[world.what_stands_in(unknown)]
            narrow = narrow or not _fits_about(outline, world, x, y, heading)
    if person < len(points):
        return Cause.PERSON
    if _near_any(points, memory.field, outline.inner).any():
        return Cause.GONE
    return Cause.NARROW if narrow else Cause.NOTHING


def _first_person(points: Points, robot: Pose, inner: float, people: NDArray[np.float64]) -> int:
    """The index of the first point that a person is in the way of; the number of points where there is none."""
    near = people[np.hypot(people[:, 0] - robot.x, people[:, 1] - robot.y) < PEOPLE_WITHIN_M]
    if not len(near) or not len(points):
        return len(points)
    apart = np.hypot(points[:, :1] - near[:, 0], points[:, 1:] - near[:, 1])
    hit = (apart < near[:, 2] + inner + ELBOW_M).any(axis=1)
    return int(np.argmax(hit)) if hit.any() else len(points)


def _near_any(points: Points, field: NDArray[np.float32], reach: float) -> NDArray[np.bool_]:
    """Whether a distance field says that anything is within reach of each point."""
    rows, columns = field.shape
    row = np.clip((points[:, 1] / CELL_M).astype(np.intp), 0, rows - 1)
    column = np.clip((points[:, 0] / CELL_M).astype(np.intp), 0, columns - 1)
    close: NDArray[np.bool_] = field[row, column] < reach
    return close


def _fits_about(outline: Outline, world: World, x: float, y: float, heading: float) -> bool:
    """Whether the robot fits within a hand's breadth beside a point of its way, at any heading near that of the way."""
    for aside in ASIDE_M:
        there_x, there_y = x - aside * math.sin(heading), y + aside * math.cos(heading)
        for turned in TURNED:
            if not covers_solid(world.blocked, outline.hull, there_x, there_y, heading + turned):
                return True
    return False


def _covered(outline: Outline, pose: Pose, blocked: NDArray[np.bool_]) -> NDArray[np.intp]:
    """The blocked cells (n, 2) that the outline touches at a pose: those with their middle at most half a cell off."""
    reach = math.ceil(outline.outer / CELL_M) + 1
    row, column = int(pose.y / CELL_M), int(pose.x / CELL_M)
    low_row, low_column = max(row - reach, 0), max(column - reach, 0)
    part = blocked[low_row : row + reach + 1, low_column : column + reach + 1]
    cells: NDArray[np.intp] = np.argwhere(part) + np.array([low_row, low_column])
    touched = [
        gap(outline.hull, pose.x, pose.y, pose.heading, (c + 0.5) * CELL_M, (r + 0.5) * CELL_M) <= 0.75 * CELL_M
        for r, c in cells.tolist()
    ]
    under: NDArray[np.intp] = cells[np.array(touched, dtype=np.bool_)]
    return under
