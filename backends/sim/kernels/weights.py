"""Weights for route planning on every second cell, straight from a distance field.

The same weights as `runner.site.routes.weight_from_clearance` gives for the largest clearance of each two by two
cells: a quarter of the cells to search, and optimistic by at most half the diagonal of a cell.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)


@kernel
def halved(field: NDArray[Any], hard: float, soft: float, strength: float) -> NDArray[Any]:
    """Weights on a grid of half the resolution: infinite below `hard` meters of clearance, 1 from `soft` on, between
    them 1 + `strength` times the square of the share that is missing."""
    rows, columns = (field.shape[0] + 1) // 2, (field.shape[1] + 1) // 2
    weight = np.empty((rows, columns), dtype=np.float32)
    per_meter = 1.0 / max(soft - hard, 1e-9)
    for row in range(rows):
        low = min(2 * row + 1, field.shape[0] - 1)
        for column in range(columns):
            side = min(2 * column + 1, field.shape[1] - 1)
            across, below = field[2 * row, side], field[low, 2 * column]
            clearance = max(field[2 * row, 2 * column], across, below, field[low, side])
            missing = max((soft - clearance) * per_meter, 0.0)
            weight[row, column] = np.inf if clearance < hard else 1.0 + strength * missing * missing
    return weight
