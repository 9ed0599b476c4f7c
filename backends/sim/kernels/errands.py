"""Small questions about people's errands, asked every tick: who has arrived or waited enough, and what is in sight."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid
from backends.sim.kernels.grid import value_at
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__)

NOBODY = -1
SIGHT_STEP_M = 0.04


@kernel
def next_due(
    first: int, people: NDArray[Any], target: NDArray[Any], wished: NDArray[Any], wake: NDArray[Any], now: float
) -> int:
    """The first person from index `first` on who stands at the target, or whose time to wake has come.

    `target` has rows (x, y, how near counts as there).
    """
    for one in range(first, people.shape[0]):
        if now >= wake[one]:
            return one
        off_x, off_y = people[one, 0] - target[one, 0], people[one, 1] - target[one, 1]
        if wished[one] > 0.0 and off_x * off_x + off_y * off_y < target[one, 2] * target[one, 2]:
            return one
    return NOBODY


@kernel
def in_sight(distance: NDArray[Any], x: float, y: float, to_x: float, to_y: float, least: float) -> bool:
    """Whether a disc of radius `least` can go straight from one point to another."""
    length = math.sqrt((to_x - x) * (to_x - x) + (to_y - y) * (to_y - y))
    travelled = 0.0
    while travelled <= length:
        share = travelled / length if length > 0.0 else 0.0
        free = value_at(distance, x + share * (to_x - x), y + share * (to_y - y))
        if free < least:
            return False
        travelled += max(free - least, SIGHT_STEP_M)
    return value_at(distance, to_x, to_y) >= least


@kernel
def pulled_straight(points: NDArray[Any], distance: NDArray[Any], least: float) -> NDArray[Any]:
    """Indices of the points at which a route has to bend when each is in sight of the one before."""
    count = points.shape[0]
    kept = np.empty(count, dtype=np.int64)
    filled, here = 0, 0
    while here < count - 1:
        ahead = here + 1
        while ahead + 1 < count and in_sight(
            distance, points[here, 0], points[here, 1], points[ahead + 1, 0], points[ahead + 1, 1], least
        ):
            ahead += 1
        kept[filled] = ahead
        filled += 1
        here = ahead
    return kept[:filled]
