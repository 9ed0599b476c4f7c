"""Looking up a raster at a point."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)

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
