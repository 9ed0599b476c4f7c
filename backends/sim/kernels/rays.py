"""Casting the rays of a planar lidar against the true floor and the people on it.

A ray goes from cell to cell exactly (Amanatides and Woo, 1987), and leaps over open floor by what the distance
field promises to be free (sphere tracing, Hart, 1996): the leap changes the time it takes, not the range.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid
from backends.sim.kernels.grid import CELLS_PER_M, value_at
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__)

CELL = 0.05
SLACK = 1.5 * CELL  # a point lies within 0.71 cells of its cell's center, an obstacle within 0.71 of its own
TURN = 2.0 * math.pi
GRAZING = math.sin(math.radians(12.0))  # light that meets a wall flatter than this does not come back
BEFORE_M = 2.0 * CELL


@kernel
def cast(distance: NDArray[Any], x: float, y: float, along_x: float, along_y: float, reach: float) -> float:
    """Range from (x, y) to the first solid cell along a unit direction; infinity where it is farther than `reach`.

    `distance` is 0 in solid cells and elsewhere at most the distance between cell centers to the nearest of them.
    """
    per_x = 1.0 / along_x if along_x != 0.0 else np.inf
    per_y = 1.0 / along_y if along_y != 0.0 else np.inf
    rows, columns = distance.shape
    right, up = int(along_x > 0.0), int(along_y > 0.0)
    row, column = math.floor(y * CELLS_PER_M), math.floor(x * CELLS_PER_M)
    travelled = 0.0
    while travelled <= reach:
        if row < 0 or column < 0 or row >= rows or column >= columns:
            return travelled
        free = distance[row, column]
        if free == 0.0:
            return travelled
        if free > 3.0 * CELL:
            travelled += free - SLACK
            row = math.floor((y + travelled * along_y) * CELLS_PER_M)
            column = math.floor((x + travelled * along_x) * CELLS_PER_M)
            continue
        side_x = ((column + right) * CELL - x) * per_x if along_x != 0.0 else np.inf
        side_y = ((row + up) * CELL - y) * per_y if along_y != 0.0 else np.inf
        if side_x < side_y:
            travelled = max(travelled, side_x)
            column += 2 * right - 1
        else:
            travelled = max(travelled, side_y)
            row += 2 * up - 1
    return np.inf


@kernel
def grazes(distance: NDArray[Any], x: float, y: float, along_x: float, along_y: float, reach: float) -> bool:
    """Whether a ray of that range meets the wall too flatly for its light to come back.

    The slope of the distance field a little before the hit tells how the wall lies.
    """
    before = max(reach - BEFORE_M, 0.0)
    at_x, at_y = x + before * along_x, y + before * along_y
    slope_x = value_at(distance, at_x + CELL, at_y) - value_at(distance, at_x - CELL, at_y)
    slope_y = value_at(distance, at_x, at_y + CELL) - value_at(distance, at_x, at_y - CELL)
    steepness = math.sqrt(slope_x * slope_x + slope_y * slope_y)
    return abs(along_x * slope_x + along_y * slope_y) < GRAZING * steepness


@kernel
def meet_person(
    ranges: NDArray[Any], x: float, y: float, first: float, step: float, person: NDArray[Any], reach: float
) -> None:
    """Shorten the ranges of the beams that meet a person, a row (x, y, radius) seen as an upright cylinder."""
    to_x, to_y, radius = person[0] - x, person[1] - y, person[2]
    apart = math.sqrt(to_x * to_x + to_y * to_y)
    if apart > reach + radius:
        return
    if apart <= radius:
        for beam in range(ranges.shape[0]):
            ranges[beam] = 0.0
        return
    half = math.asin(radius / apart)
    bearing = math.atan2(to_y, to_x) - first
    bearing -= math.floor(bearing / TURN) * TURN
    for turn in range(-1, 1):
        middle = bearing + turn * TURN
        low = max(math.ceil((middle - half) / step), 0)
        high = min(math.floor((middle + half) / step), ranges.shape[0] - 1)
        for beam in range(low, high + 1):
            off = beam * step - middle
            along = apart * math.cos(off)
            across = apart * math.sin(off)
            met = along - math.sqrt(max(radius * radius - across * across, 0.0))
            if met <= reach:
                ranges[beam] = min(ranges[beam], met)


@kernel
def scan(
    distance: NDArray[Any],
    people: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    reach: float,
    noise: float,
    drawn: NDArray[Any],
    ranges: NDArray[Any],
) -> None:
    """Fill `ranges` with one scan: beam i points to `first` + i * `step`; infinity where nothing came back.

    `drawn` holds a standard normal number for each beam: to hand them over costs less than to hand over a generator.
    """
    for beam in range(ranges.shape[0]):
        angle = first + beam * step
        along_x, along_y = math.cos(angle), math.sin(angle)
        met = cast(distance, x, y, along_x, along_y, reach)
        ranges[beam] = np.inf if met < np.inf and grazes(distance, x, y, along_x, along_y, met) else met
    for index in range(people.shape[0]):
        meet_person(ranges, x, y, first, step, people[index], reach)
    for beam in range(ranges.shape[0]):
        if ranges[beam] < np.inf:
            ranges[beam] = max(ranges[beam] + noise * drawn[beam], 0.0)
