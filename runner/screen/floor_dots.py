"""What stands still on a floor as dots: walls as unbroken lines, furniture as a lighter pattern, doors as gaps."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from runner.site.floor import Floor, rasterize
from runner.site.values import CELL_M, Point, Site, Solid

_THIN = 0.35
"""Meters. A solid with a side this short is drawn as a wall: floors drawn in text have their walls as solids."""


@dataclass(frozen=True, slots=True)
class Scale:
    """Where a point of the site falls among the dots. `left` and `top` are the margins, in dots."""

    columns: int
    rows: int
    dots_per_meter: float
    left: float
    top: float
    height: float
    """Of the site, meters: y points up there and down here."""

    def dot(self, point: Point) -> tuple[int, int]:
        """Row and column of the dot a point falls on; it may lie outside."""
        x, y = point
        return (
            math.floor(self.top + (self.height - y) * self.dots_per_meter),
            math.floor(self.left + x * self.dots_per_meter),
        )

    def spot(self, point: Point) -> tuple[int, int] | None:
        """The cell a point falls in, None outside."""
        row, column = self.dot(point)
        row, column = row // 4, column // 2
        return (row, column) if 0 <= row < self.rows and 0 <= column < self.columns else None


def fit(site: Site, columns: int, rows: int) -> Scale:
    """The scale at which the whole floor just fits, centered. Both of its outer edges fall on a dot."""
    dots = max(min((columns * 2 - 1) / site.width, (rows * 4 - 1) / site.height), 0.0)
    left = (columns * 2 - site.width * dots) / 2
    top = (rows * 4 - site.height * dots) / 2
    return Scale(columns, rows, dots, left, top, site.height)


@dataclass(frozen=True, slots=True)
class Standing:
    """A site made ready to be drawn: the lines that walls follow, the raster of walls, and that of furniture."""

    site: Site
    lines: tuple[Sequence[Point], ...]
    walls: Floor
    furniture: NDArray[np.bool_]


def standing(site: Site) -> Standing:
    """Tell walls from furniture, once a site."""
    thin = tuple(block for block in site.solids if min(_extent(block)) <= _THIN)
    walls = rasterize(replace(site, solids=thin))
    lines = (*(wall.points for wall in site.walls), *map(_middle_line, thin))
    return Standing(site, lines, walls, rasterize(site).solid & ~walls.solid)


def _extent(block: Solid) -> tuple[float, float]:
    xs, ys = zip(*block.corners, strict=True)
    return max(xs) - min(xs), max(ys) - min(ys)


def _middle_line(block: Solid) -> Sequence[Point]:
    """The long axis of a thin solid's bounding box."""
    xs, ys = zip(*block.corners, strict=True)
    x, y = (min(xs) + max(xs)) / 2, (min(ys) + max(ys)) / 2
    width, height = _extent(block)
    return ((min(xs), y), (max(xs), y)) if width >= height else ((x, min(ys)), (x, max(ys)))


def wall_dots(still: Standing, scale: Scale) -> NDArray[np.bool_]:
    """True for each dot that is wall.

    A dot that is at least half covered is; and so is each one that the middle line of a wall runs through, so that a
    wall thinner than a dot is still one unbroken line, but for its doors.
    """
    dots = _covered(still.walls.solid, scale) >= 0.5
    for points in still.lines:
        for point in along(points, 0.5 / scale.dots_per_meter):
            row, column = scale.dot(point)
            if 0 <= row < dots.shape[0] and 0 <= column < dots.shape[1] and _solid_near(still.walls, point):
                dots[row, column] = True
    for door in still.site.doors:
        for row, column in stroke((door.start, door.end), scale, inset=0.3):
            if 0 <= row < dots.shape[0] and 0 <= column < dots.shape[1]:
                dots[row, column] = False
    return dots


def furniture_dots(still: Standing, scale: Scale) -> NDArray[np.bool_]:
    """Every other dot of what is furniture, and each one that stands alone."""
    covered: NDArray[np.bool_] = _covered(still.furniture, scale) >= 0.4
    padded = np.pad(covered, 1)
    neighbors = padded[:-2, 1:-1] | padded[2:, 1:-1] | padded[1:-1, :-2] | padded[1:-1, 2:]
    rows, columns = np.indices(covered.shape)
    every_other: NDArray[np.bool_] = (rows + columns) % 2 == 0
    return covered & (every_other | ~neighbors)


def _covered(solid: NDArray[np.bool_], scale: Scale) -> NDArray[np.float64]:
    """The share of each dot that is solid, from every raster cell in sight, in parts where dots are smaller."""
    parts = max(1, math.ceil(scale.dots_per_meter * CELL_M))
    shape = (scale.rows * 4, scale.columns * 2)
    (low, high), (first, end) = _in_sight(scale, solid.shape)
    samples = solid[low:high, first:end].repeat(parts, axis=0).repeat(parts, axis=1)
    ys = low * CELL_M + (np.arange(samples.shape[0]) + 0.5) * (CELL_M / parts)
    xs = first * CELL_M + (np.arange(samples.shape[1]) + 0.5) * (CELL_M / parts)
    down = np.floor(scale.top + (scale.height - ys) * scale.dots_per_meter).astype(np.intp)
    across = np.floor(scale.left + xs * scale.dots_per_meter).astype(np.intp)
    counts = np.zeros(shape)
    inside = (down >= 0) & (down < shape[0])
    within = (across >= 0) & (across < shape[1])
    found_rows, found_columns = np.nonzero(samples & inside[:, None] & within[None, :])
    np.add.at(counts, (down[found_rows], across[found_columns]), 1.0)
    most = np.outer(np.bincount(down[inside], minlength=shape[0]), np.bincount(across[within], minlength=shape[1]))
    return np.asarray(counts / np.maximum(most, 1), dtype=np.float64)


def _in_sight(scale: Scale, shape: tuple[int, ...]) -> tuple[tuple[int, int], tuple[int, int]]:
    """The ranges of raster rows and columns that fall into the picture."""
    dots = max(scale.dots_per_meter, math.ulp(1.0))
    top = scale.height + scale.top / dots
    bottom = top - scale.rows * 4 / dots
    left = -scale.left / dots
    right = left + scale.columns * 2 / dots
    return _cells(bottom, top, shape[0]), _cells(left, right, shape[1])


def _cells(low: float, high: float, count: int) -> tuple[int, int]:
    """The cells of a raster of so many between two lengths, one to spare at each end."""
    first = min(max(math.floor(max(low, 0.0) / CELL_M) - 1, 0), count)
    return first, min(max(math.ceil(min(high / CELL_M, count)) + 1, first), count)


def _solid_near(floor: Floor, point: Point) -> bool:
    """Whether the raster is solid at a point or right beside it: a line along an edge counts, a doorway does not."""
    row, column = math.floor(point[1] / CELL_M), math.floor(point[0] / CELL_M)
    around = floor.solid[max(row - 1, 0) : row + 2, max(column - 1, 0) : column + 2]
    return bool(around.any())


def along(points: Sequence[Point], step: float) -> Iterable[Point]:
    """Points no farther apart than `step` along a polyline, its ends included."""
    for (x1, y1), (x2, y2) in pairwise(points):
        count = max(math.ceil(math.hypot(x2 - x1, y2 - y1) / step), 1)
        for number in range(count + 1):
            share = number / count
            yield x1 + (x2 - x1) * share, y1 + (y2 - y1) * share


def stroke(points: Sequence[Point], scale: Scale, inset: float = 0.0) -> Iterable[tuple[int, int]]:
    """The dots along a polyline; `inset` leaves that share of a single segment's length away at either end."""
    if inset:
        (x1, y1), (x2, y2) = points[0], points[-1]
        dx, dy = (x2 - x1) * inset, (y2 - y1) * inset
        points = ((x1 + dx, y1 + dy), (x2 - dx, y2 - dy))
    return (scale.dot(point) for point in along(points, 0.5 / scale.dots_per_meter))
