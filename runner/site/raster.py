"""Which cells a shape covers: strokes with a thickness and filled polygons, on the 5 cm grid of a site.

Every function returns the (row, column) pairs of the covered cells inside a grid of `shape` (rows, columns), as an
integer array of shape (n, 2) in row order. Row 0 is the lowest y. A shape reaching beyond the grid is cut off there.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from runner.site.values import CELL_M, Point

Cells = NDArray[np.intp]
Shape = tuple[int, int]

_SLACK = 1e-9  # meters: a cell center exactly on an edge counts as covered, whatever the rounding


def stroke_cells(points: Sequence[Point], thickness: float, shape: Shape) -> Cells:
    """Cells whose centers lie on a polyline of that thickness: flat at its two ends, round at its bends.

    A stroke thinner than a cell is drawn one cell thick, so that no route slips through it.
    """
    half = max(thickness, CELL_M) / 2.0 + _SLACK
    parts = [_bar_cells(start, end, half, shape) for start, end in pairwise(points)]
    bends = points if points[0] == points[-1] else points[1:-1]
    parts += [_disc_cells(bend, half, shape) for bend in bends]
    return _merged(parts)


def polygon_cells(corners: Sequence[Point], shape: Shape) -> Cells:
    """Cells whose centers lie in a filled polygon, and those its edges pass through the middle of."""
    lowest, highest = _corner_box(corners, 0.0)
    rows, columns, x, y = _window(lowest, highest, shape)
    inside = np.zeros(np.broadcast_shapes(x.shape, y.shape), dtype=np.bool_)
    outline = [*corners, corners[0]]
    for (x1, y1), (x2, y2) in pairwise(outline):
        if y1 != y2:
            crossing = ((y1 > y) != (y2 > y)) & (x < x1 + (y - y1) * (x2 - x1) / (y2 - y1))
            inside ^= crossing
    edges = [_bar_cells(start, end, 0.49 * CELL_M, shape) for start, end in pairwise(outline)]
    return _merged([_picked(inside, rows, columns), *edges])


def _bar_cells(start: Point, end: Point, half: float, shape: Shape) -> Cells:
    length = math.hypot(end[0] - start[0], end[1] - start[1])
    if length == 0.0:
        return np.empty((0, 2), dtype=np.intp)
    along_x, along_y = (end[0] - start[0]) / length, (end[1] - start[1]) / length
    rows, columns, x, y = _window(*_corner_box((start, end), half), shape)
    along = (x - start[0]) * along_x + (y - start[1]) * along_y
    aside = (x - start[0]) * along_y - (y - start[1]) * along_x
    covered = (along >= -_SLACK) & (along <= length + _SLACK) & (np.abs(aside) <= half)
    return _picked(covered, rows, columns)


def _disc_cells(center: Point, radius: float, shape: Shape) -> Cells:
    rows, columns, x, y = _window(*_corner_box((center,), radius), shape)
    return _picked((x - center[0]) ** 2 + (y - center[1]) ** 2 <= radius**2, rows, columns)


def _corner_box(points: Sequence[Point], margin: float) -> tuple[Point, Point]:
    xs, ys = [point[0] for point in points], [point[1] for point in points]
    return (min(xs) - margin, min(ys) - margin), (max(xs) + margin, max(ys) + margin)


def _window(
    lowest: Point, highest: Point, shape: Shape
) -> tuple[slice, slice, NDArray[np.float64], NDArray[np.float64]]:
    """The rows and columns that can be covered, with x (1, columns) and y (rows, 1) of their centers."""
    rows = _span(lowest[1], highest[1], shape[0])
    columns = _span(lowest[0], highest[0], shape[1])
    x = (np.arange(columns.start, columns.stop) + 0.5)[None, :] * CELL_M
    y = (np.arange(rows.start, rows.stop) + 0.5)[:, None] * CELL_M
    return rows, columns, x, y


def _span(low: float, high: float, count: int) -> slice:
    first = min(max(math.floor(low / CELL_M) - 1, 0), count)
    last = max(min(math.floor(high / CELL_M) + 2, count), first)
    return slice(first, last)


def _picked(covered: NDArray[np.bool_], rows: slice, columns: slice) -> Cells:
    found = np.argwhere(covered)
    return found + np.array([rows.start, columns.start], dtype=np.intp)


def _merged(parts: Sequence[Cells]) -> Cells:
    joined = np.concatenate(parts) if parts else np.empty((0, 2), dtype=np.intp)
    return np.unique(joined, axis=0)
