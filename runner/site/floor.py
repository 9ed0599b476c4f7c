"""A site as a grid of 5 cm cells: what is solid, where the doors are, and how far each cell is from trouble.

Arrays are indexed (row, column) with row 0 at the lowest y, so cell (r, c) has its center at
x = (c + 0.5) * CELL_M, y = (r + 0.5) * CELL_M. What lies outside the floor is as good as solid.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from runner.site.raster import polygon_cells, stroke_cells
from runner.site.values import CELL_M, Door, Point, Pose, Site

Cell = tuple[int, int]
"""(row, column)."""


@dataclass(frozen=True, slots=True)
class Floor:
    """`solid` is True where walls and solids are, doors open; `doors` holds the (n, 2) cells of each door leaf."""

    solid: NDArray[np.bool_]
    doors: dict[str, NDArray[np.intp]]

    @property
    def shape(self) -> tuple[int, int]:
        """(rows, columns)."""
        return self.solid.shape[0], self.solid.shape[1]

    def blocked(self, shut: Iterable[str] = ()) -> NDArray[np.bool_]:
        """A fresh array: True where a robot cannot be while the named doors are shut. KeyError on no such door."""
        cells = self.solid.copy()
        for name in shut:
            leaf = self.doors[name]
            cells[leaf[:, 0], leaf[:, 1]] = True
        return cells


def rasterize(site: Site) -> Floor:
    """The floor of a site. A door cuts its opening out of any wall drawn across it, but not out of solids."""
    shape = (max(math.ceil(site.height / CELL_M - 1e-6), 1), max(math.ceil(site.width / CELL_M - 1e-6), 1))
    solid = np.zeros(shape, dtype=np.bool_)
    for wall in site.walls:
        _set(solid, stroke_cells(wall.points, wall.thickness, shape), True)
    doors = {door.name: _leaf_cells(door, site, shape) for door in site.doors}
    for leaf in doors.values():
        _set(solid, leaf, False)
    for block in site.solids:
        _set(solid, polygon_cells(block.corners, shape), True)
    return Floor(solid, doors)


def _leaf_cells(door: Door, site: Site, shape: tuple[int, int]) -> NDArray[np.intp]:
    """The cells of a door: as thick as the wall it may stand in, so that nothing of the wall is left in the gap."""
    thickness = max([door.thickness, *(wall.thickness for wall in site.walls)])
    return stroke_cells((door.start, door.end), thickness, shape)


def _set(grid: NDArray[np.bool_], cells: NDArray[np.intp], value: bool) -> None:
    grid[cells[:, 0], cells[:, 1]] = value


def doors_shut_at(site: Site, clock: float) -> tuple[str, ...]:
    """Names of the doors known to be shut at that time of day, in seconds since midnight."""
    return tuple(door.name for door in site.doors if any(_within(span, clock) for span in door.shut))


def _within(span: tuple[float, float], clock: float) -> bool:
    start, end = span
    return start <= clock < end if start <= end else clock >= start or clock < end


def cell_of(point: Point) -> Cell:
    """The cell a point lies in. It may lie outside the floor."""
    return math.floor(point[1] / CELL_M), math.floor(point[0] / CELL_M)


def center_of(cell: Cell) -> Point:
    """The center of a cell, meters."""
    return (cell[1] + 0.5) * CELL_M, (cell[0] + 0.5) * CELL_M


def clearance(blocked: NDArray[np.bool_]) -> NDArray[np.float32]:
    """Meters from each cell's center to the center of the nearest blocked cell; 0 in blocked cells.

    Exact Euclidean distances (scipy's transform, after Maurer, Qi and Raghavan, 2003). Everything outside the floor
    counts as blocked.
    """
    from scipy.ndimage import distance_transform_edt

    free = np.pad(~blocked, 1, constant_values=False)
    distances = distance_transform_edt(free, sampling=CELL_M)
    return np.ascontiguousarray(distances[1:-1, 1:-1], dtype=np.float32)


def inscribed_radius(footprint: Sequence[Point]) -> float:
    """Radius of the largest disc around the turning center inside the footprint, 0 where the center is outside."""
    if not _holds_origin(footprint):
        return 0.0
    return min(_origin_to_edge(start, end) for start, end in pairwise([*footprint, footprint[0]]))


def circumscribed_radius(footprint: Sequence[Point]) -> float:
    """Radius of the smallest disc around the turning center that holds the footprint: what it sweeps in a full turn."""
    return max(math.hypot(x, y) for x, y in footprint)


def footprint_at(footprint: Sequence[Point], pose: Pose) -> tuple[Point, ...]:
    """The footprint polygon in the site frame, with the robot standing at a pose."""
    cosine, sine = math.cos(pose.heading), math.sin(pose.heading)
    return tuple((pose.x + x * cosine - y * sine, pose.y + x * sine + y * cosine) for x, y in footprint)


def footprint_free(blocked: NDArray[np.bool_], footprint: Sequence[Point], pose: Pose) -> bool:
    """Whether the footprint at a pose lies on the floor and covers no blocked cell's middle."""
    rows, columns = blocked.shape
    corners = footprint_at(footprint, pose)
    if any(not (0.0 <= x <= columns * CELL_M and 0.0 <= y <= rows * CELL_M) for x, y in corners):
        return False
    covered = polygon_cells(corners, (rows, columns))
    return not bool(blocked[covered[:, 0], covered[:, 1]].any())


def _holds_origin(footprint: Sequence[Point]) -> bool:
    inside = False
    for (x1, y1), (x2, y2) in pairwise([*footprint, footprint[0]]):
        if (y1 > 0.0) != (y2 > 0.0) and x1 - y1 * (x2 - x1) / (y2 - y1) > 0.0:
            inside = not inside
    return inside


def _origin_to_edge(start: Point, end: Point) -> float:
    dx, dy = end[0] - start[0], end[1] - start[1]
    square = dx * dx + dy * dy
    share = 0.0 if square == 0.0 else min(max(-(start[0] * dx + start[1] * dy) / square, 0.0), 1.0)
    return math.hypot(start[0] + share * dx, start[1] + share * dy)
