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
REACH_M = 0.9  # somebody this near to a shut door, on the way through it, opens it
LEFT_M = 0.7  # somebody this far behind a door has left it behind
FAR_M = 4.0  # farther from a door than this one has nothing to do with it


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


@kernel
def at_doors(
    people: NDArray[Any],
    target: NDArray[Any],
    wished: NDArray[Any],
    doors: NDArray[Any],
    sides: NDArray[Any],
    behind: NDArray[Any],
    wanted: NDArray[Any],
    left: NDArray[Any],
) -> int:
    """Who is about to go through which door, and who has just left one behind.

    `doors` has rows (x, y, x, y) of both ends of the leaf. `sides` (people, doors) and `behind` (people) are kept from
    tick to tick. Fills `wanted` with whether anybody is on the way through each door and near it, and `left` with the
    doors left behind, whose number is returned.
    """
    wanted[:] = False
    count = 0
    for one in range(people.shape[0]):
        for door in range(doors.shape[0]):
            along_x, along_y = doors[door, 2] - doors[door, 0], doors[door, 3] - doors[door, 1]
            width = math.sqrt(along_x * along_x + along_y * along_y)
            along_x, along_y = along_x / width, along_y / width
            middle_x, middle_y = (doors[door, 0] + doors[door, 2]) / 2.0, (doors[door, 1] + doors[door, 3]) / 2.0
            off_x, off_y = people[one, 0] - middle_x, people[one, 1] - middle_y
            if abs(off_x) > FAR_M or abs(off_y) > FAR_M:
                sides[one, door] = 0
                if behind[one] == door:
                    behind[one] = NOBODY
                continue
            beside = off_x * along_x + off_y * along_y
            off = off_y * along_x - off_x * along_y
            if wished[one] > 0.0 and abs(off) < REACH_M:
                to_x, to_y = target[one, 0] - middle_x, target[one, 1] - middle_y
                end = to_y * along_x - to_x * along_y
                if off * end < 0.0:
                    crossing = beside + (to_x * along_x + to_y * along_y - beside) * off / (off - end)
                    if abs(crossing) < width / 2.0:
                        wanted[door] = True
            side = 1 if off > 0.0 else -1
            if sides[one, door] == -side and abs(beside) < width / 2.0:
                behind[one] = door
            sides[one, door] = side
            if behind[one] == door and abs(off) > LEFT_M:
                behind[one] = NOBODY
                left[count] = door
                count += 1
    return count
