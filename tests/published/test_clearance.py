"""Clearance against distances that can be written down.

One blocked cell at the center of a 7 x 7 grid, its distances by Pythagoras: 3 * sqrt(2) cells at the corner, 3 at the
middle of an edge, sqrt(5) a knight's move away; `scipy.ndimage.distance_transform_edt` (scipy 1.17.1) gives the same.
Here the outside counts as blocked, so the 7 x 7 grid lies in the middle of a much larger free floor.
"""

from __future__ import annotations

import numpy as np
import pytest

from runner.site.floor import clearance
from runner.site.values import CELL_M


@pytest.mark.parametrize(
    ("row", "column", "cells"), [(0, 0, 4.2426407), (3, 0, 3.0), (1, 2, 2.2360680), (3, 3, 0.0), (2, 2, 1.4142136)]
)
def test_distances_from_a_single_blocked_cell_are_euclidean(row: int, column: int, cells: float) -> None:
    blocked = np.zeros((27, 27), dtype=np.bool_)
    blocked[13, 13] = True
    assert clearance(blocked)[10 + row, 10 + column] == pytest.approx(cells * CELL_M, abs=1e-7)


def test_a_corner_cell_of_the_small_grid_is_21_centimeters_away() -> None:
    blocked = np.zeros((27, 27), dtype=np.bool_)
    blocked[13, 13] = True
    assert clearance(blocked)[10, 10] == pytest.approx(0.2121320, abs=1e-7)
