"""The shape of the robot in the forms that the kernels need."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from runner.site.floor import circumscribed_radius, inscribed_radius
from runner.site.values import Point

RIM_SPACING_M = 0.1
"""Two neighboring points of the rim are no farther apart, so that nothing slips between them unseen (MODEL.md)."""


@dataclass(frozen=True, slots=True)
class Outline:
    """`hull` (n, 2): the convex hull of the footprint, counterclockwise, what is true. `rim` (m, 3): points along it
    and the distance to the next, what the follower looks at. `inner` and `outer`: inscribed and circumscribed radius.
    """

    hull: NDArray[np.float64]
    rim: NDArray[np.float64]
    inner: float
    outer: float


def outline_of(footprint: Sequence[Point]) -> Outline:
    """The outline of a footprint polygon."""
    hull = convex_hull(footprint)
    corners, rim = np.array(hull, dtype=np.float64), np.array(_rim(hull), dtype=np.float64)
    return Outline(corners, rim, inscribed_radius(hull), circumscribed_radius(hull))


def convex_hull(points: Sequence[Point]) -> list[Point]:
    """Corners of the convex hull, counterclockwise (Andrew's monotone chain, 1979)."""
    ordered = sorted(set(points))
    return _chain(ordered)[:-1] + _chain(ordered[::-1])[:-1]


def _chain(points: Sequence[Point]) -> list[Point]:
    chain: list[Point] = []
    for point in points:
        while len(chain) >= 2 and _turn(chain[-2], chain[-1], point) <= 0.0:
            chain.pop()
        chain.append(point)
    return chain


def _turn(a: Point, b: Point, c: Point) -> float:
    return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])


def _rim(hull: Sequence[Point]) -> list[tuple[float, float, float]]:
    rim: list[tuple[float, float, float]] = []
    for (x1, y1), (x2, y2) in pairwise([*hull, hull[0]]):
        side = math.hypot(x2 - x1, y2 - y1)
        parts = max(1, math.ceil(side / RIM_SPACING_M))
        step = side / parts
        rim += [(x1 + (x2 - x1) * part / parts, y1 + (y2 - y1) * part / parts, step) for part in range(parts)]
    return rim
