"""Arithmetic on a route: smoothing it, finding the robot on it, and whether something now stands on it.

A route is `points`, shape (n, 2), with the length from its start to each point in `along`, shape (n,).
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid
from backends.sim.kernels.grid import value_at
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__)

CLEAR = -1


@kernel
def smoothed(points: NDArray[Any], field: NDArray[Any], least: float, half: int) -> NDArray[Any]:
    """The route with each inner point at the mean of its neighbors up to `half` away on both sides.

    A point stays where it is where its mean would have less clearance than both itself and `least`.
    """
    count = points.shape[0]
    result = points.copy()
    for index in range(1, count - 1):
        reach = min(half, index, count - 1 - index)
        x, y = 0.0, 0.0
        for near in range(index - reach, index + reach + 1):
            x += points[near, 0]
            y += points[near, 1]
        x /= 2 * reach + 1
        y /= 2 * reach + 1
        if value_at(field, x, y) >= min(least, value_at(field, points[index, 0], points[index, 1])):
            result[index, 0], result[index, 1] = x, y
    return result


@kernel
def lengths(points: NDArray[Any]) -> NDArray[Any]:
    """Length of the route from its start to each of its points."""
    along = np.zeros(points.shape[0])
    for index in range(1, points.shape[0]):
        off_x, off_y = points[index, 0] - points[index - 1, 0], points[index, 1] - points[index - 1, 1]
        along[index] = along[index - 1] + math.sqrt(off_x * off_x + off_y * off_y)
    return along


@kernel
def index_at(along: NDArray[Any], length: float) -> int:
    """The last point at or before a length along the route."""
    low, high = 0, along.shape[0]
    while high - low > 1:
        middle = (low + high) // 2
        if along[middle] <= length:
            low = middle
        else:
            high = middle
    return low


@kernel
def project(
    points: NDArray[Any], along: NDArray[Any], x: float, y: float, low: float, high: float
) -> tuple[float, float]:
    """Where on the part of the route between two lengths a point is nearest: (length along, distance from it).

    By the nearest point of the route and the two sides that meet there, which is exact where a route does not come
    back on itself within the part.
    """
    first, last = index_at(along, low), min(index_at(along, high) + 1, points.shape[0] - 1)
    best, nearest = np.inf, first
    for index in range(first, last + 1):
        off_x, off_y = x - points[index, 0], y - points[index, 1]
        square = off_x * off_x + off_y * off_y
        if square < best:
            best, nearest = square, index
    found = along[nearest]
    for index in range(max(nearest - 1, first), min(nearest + 1, last)):
        side_x, side_y = points[index + 1, 0] - points[index, 0], points[index + 1, 1] - points[index, 1]
        to_x, to_y = x - points[index, 0], y - points[index, 1]
        size = side_x * side_x + side_y * side_y
        share = min(max((to_x * side_x + to_y * side_y) / size, 0.0), 1.0) if size > 0.0 else 0.0
        off_x, off_y = to_x - share * side_x, to_y - share * side_y
        square = off_x * off_x + off_y * off_y
        if square < best:
            best = square
            found = along[index] + share * (along[index + 1] - along[index])
    return found, math.sqrt(best)


@kernel
def point_at(points: NDArray[Any], along: NDArray[Any], length: float) -> tuple[float, float]:
    """The point at a length along the route; its end beyond it."""
    index = index_at(along, length)
    if index >= points.shape[0] - 1:
        return points[index, 0], points[index, 1]
    share = (length - along[index]) / max(along[index + 1] - along[index], 1e-9)
    share = min(max(share, 0.0), 1.0)
    return (
        points[index, 0] + share * (points[index + 1, 0] - points[index, 0]),
        points[index, 1] + share * (points[index + 1, 1] - points[index, 1]),
    )


@kernel
def obstructed(
    points: NDArray[Any], along: NDArray[Any], field: NDArray[Any], length: float, least: NDArray[Any]
) -> int:
    """The first point of the route beyond `length` with less clearance than `least` has for it; else `CLEAR`."""
    for index in range(index_at(along, length), points.shape[0]):
        if value_at(field, points[index, 0], points[index, 1]) < least[index]:
            return index
    return CLEAR


@kernel
def clearances(points: NDArray[Any], field: NDArray[Any], most: float) -> NDArray[Any]:
    """The clearance at each point of a route, as far as it is below `most`."""
    result = np.empty(points.shape[0])
    for index in range(points.shape[0]):
        result[index] = min(value_at(field, points[index, 0], points[index, 1]), most)
    return result
