"""Looking up a raster at a point."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)

QUARTER = 0.5 * math.pi
CELLS_PER_M = 20.0
"""The inverse of `runner.site.values.CELL_M`."""


@kernel
def value_at(field: NDArray[Any], x: float, y: float) -> float:
    """The value of the cell that the point lies in; 0 outside the floor, which is as good as solid."""
    if x < 0.0 or y < 0.0:
        return 0.0
    row = int(y * CELLS_PER_M)
    column = int(x * CELLS_PER_M)
    if row >= field.shape[0] or column >= field.shape[1]:
        return 0.0
    return float(field[row, column])


@kernel
def bearing_of(y: float, x: float) -> float:
    """The angle of a direction, from -pi to pi, to 0.00001 (Abramowitz and Stegun, 1964, 4.4.49); faster than exact."""
    wide, high = abs(x), abs(y)
    share = min(wide, high) / max(wide, high, 1e-300)
    square = share * share
    series = -0.3302995 + square * (0.1801410 + square * (-0.0851330 + square * 0.0208351))
    angle = share * (0.9998660 + square * series)
    if high > wide:
        angle = QUARTER - angle
    if x < 0.0:
        angle = 2.0 * QUARTER - angle
    return -angle if y < 0.0 else angle


@kernel
def nearest_finite(weight: NDArray[Any], row: int, column: int, reach: int) -> tuple[int, int]:
    """The cell nearest to (row, column), at most `reach` cells off by row and column, whose weight is not infinite.

    (-1, -1) where there is none. Of equally near cells, the first by row, then by column.
    """
    best = (reach + 1) * (reach + 1) * 2
    found = (-1, -1)
    for r in range(max(row - reach, 0), min(row + reach + 1, weight.shape[0])):
        for c in range(max(column - reach, 0), min(column + reach + 1, weight.shape[1])):
            square = (r - row) * (r - row) + (c - column) * (c - column)
            if square < best and weight[r, c] < np.inf:
                best = square
                found = (r, c)
    return found
