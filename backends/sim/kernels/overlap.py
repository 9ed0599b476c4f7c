"""Whether the true outline of the robot covers anything: the check that decides what can happen.

The outline is a convex polygon, corners counterclockwise in the robot frame, shape (n, 2). Cells are closed squares.
Exact, by the separating axis theorem: two convex shapes are apart where the normal of one of their sides tells
them apart.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid, motion
from backends.sim.kernels.grid import CELLS_PER_M
from backends.sim.kernels.motion import glide
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__, motion.__file__)

CELL = 0.05
SUBSTEP = 0.02  # meters a corner of the outline may travel between two checks
FREE, SOLID, PERSON = 0, 1, 2


@kernel
def placed(outline: NDArray[Any], x: float, y: float, heading: float) -> NDArray[Any]:
    """The corners of the outline in the site frame."""
    cosine, sine = math.cos(heading), math.sin(heading)
    corners = np.empty_like(outline)
    for index in range(outline.shape[0]):
        corners[index, 0] = x + outline[index, 0] * cosine - outline[index, 1] * sine
        corners[index, 1] = y + outline[index, 0] * sine + outline[index, 1] * cosine
    return corners


@kernel
def apart(corners: NDArray[Any], row: int, column: int) -> bool:
    """Whether a side of the convex polygon separates it from the square of a cell (boxes known to overlap)."""
    x = (column + 0.5) * CELL
    y = (row + 0.5) * CELL
    count = corners.shape[0]
    for index in range(count):
        following = (index + 1) % count
        normal_x = corners[following, 1] - corners[index, 1]
        normal_y = corners[index, 0] - corners[following, 0]
        edge = normal_x * corners[index, 0] + normal_y * corners[index, 1]
        reach = 0.5 * CELL * (abs(normal_x) + abs(normal_y))
        if normal_x * x + normal_y * y - reach >= edge:
            return True
    return False


@kernel
def covers_solid(blocked: NDArray[Any], outline: NDArray[Any], x: float, y: float, heading: float) -> bool:
    """Whether the outline at a pose overlaps a blocked cell or reaches beyond the floor."""
    corners = placed(outline, x, y, heading)
    low_x, low_y, high_x, high_y = np.inf, np.inf, -np.inf, -np.inf
    for index in range(corners.shape[0]):
        low_x, high_x = min(low_x, corners[index, 0]), max(high_x, corners[index, 0])
        low_y, high_y = min(low_y, corners[index, 1]), max(high_y, corners[index, 1])
    rows, columns = blocked.shape
    if low_x < 0.0 or low_y < 0.0 or high_x > columns * CELL or high_y > rows * CELL:
        return True
    for row in range(int(low_y * CELLS_PER_M), min(int(high_y * CELLS_PER_M) + 1, rows)):
        for column in range(int(low_x * CELLS_PER_M), min(int(high_x * CELLS_PER_M) + 1, columns)):
            if blocked[row, column] and not apart(corners, row, column):
                return True
    return False


@kernel
def nearest(
    outline: NDArray[Any], x: float, y: float, heading: float, point_x: float, point_y: float
) -> tuple[float, float, float]:
    """From the outline at a pose to a point: the distance, negative inside, and the way there (site frame) from the
    nearest point of the outline, as long as the distance."""
    cosine, sine = math.cos(heading), math.sin(heading)
    ahead = (point_x - x) * cosine + (point_y - y) * sine
    left = -(point_x - x) * sine + (point_y - y) * cosine
    count = outline.shape[0]
    least, way_ahead, way_left = np.inf, 0.0, 0.0
    inside = True
    for index in range(count):
        following = (index + 1) % count
        start_x, start_y = outline[index, 0], outline[index, 1]
        side_x, side_y = outline[following, 0] - start_x, outline[following, 1] - start_y
        to_x, to_y = ahead - start_x, left - start_y
        if side_x * to_y - side_y * to_x < 0.0:
            inside = False
        share = min(max((to_x * side_x + to_y * side_y) / (side_x * side_x + side_y * side_y), 0.0), 1.0)
        off_x, off_y = to_x - share * side_x, to_y - share * side_y
        square = off_x * off_x + off_y * off_y
        if square < least:
            least, way_ahead, way_left = square, off_x, off_y
    distance = math.sqrt(least)
    way_x, way_y = way_ahead * cosine - way_left * sine, way_ahead * sine + way_left * cosine
    return (-distance if inside else distance), way_x, way_y


@kernel
def gap(outline: NDArray[Any], x: float, y: float, heading: float, point_x: float, point_y: float) -> float:
    """Meters from the outline at a pose to a point; negative inside."""
    return nearest(outline, x, y, heading, point_x, point_y)[0]


@kernel
def moved(
    blocked: NDArray[Any],
    distance: NDArray[Any],
    people: NDArray[Any],
    outline: NDArray[Any],
    reach: float,
    pose: NDArray[Any],
    speed: float,
    side: float,
    turn: float,
    time: float,
) -> int:
    """Drive the arc as far as it is free, in small steps, and change `pose` in place.

    `people` has rows (x, y, radius); `reach` is the circumscribed radius of the outline. Returns what it came up
    against: `FREE`, `SOLID` or `PERSON`.
    """
    steps = max(1, math.ceil((abs(speed) + abs(side) + abs(turn) * reach) * time / SUBSTEP))
    x, y, heading = pose[0], pose[1], pose[2]
    for step in range(1, steps + 1):
        new_x, new_y, new_heading = glide(x, y, heading, speed, side, turn, time * step / steps)
        if grid.value_at(distance, new_x, new_y) < reach + 2.0 * CELL and covers_solid(
            blocked, outline, new_x, new_y, new_heading
        ):
            return SOLID
        for index in range(people.shape[0]):
            person_x, person_y, radius = people[index, 0], people[index, 1], people[index, 2]
            if abs(person_x - new_x) > reach + radius or abs(person_y - new_y) > reach + radius:
                continue
            closest = gap(outline, new_x, new_y, new_heading, person_x, person_y)
            if closest < radius and closest < gap(outline, pose[0], pose[1], pose[2], person_x, person_y):
                return PERSON
        pose[0], pose[1], pose[2] = new_x, new_y, new_heading
    return FREE
