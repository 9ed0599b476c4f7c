"""In which order to visit places: true route lengths over the floor, and the shortest open path through them.

Up to EXACT_MOST places the order is the best there is (Held and Karp, 1962); beyond, a good one: the nearest place
next, then reversals of stretches while they help (2-opt, Croes, 1958). `trundle check` says where that is so.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import combinations

from runner.language.mission import Mission
from runner.site.values import Place

Matrix = tuple[tuple[float, ...], ...]
"""Lengths from row to column; the diagonal is 0."""

Lengths = Callable[[Mission, tuple[Place, ...]], Matrix]

EXACT_MOST = 12
"""Places ordered exactly, besides the one the path begins at: 12 x 12 x 4096 sums, some milliseconds."""


def floor_lengths(mission: Mission, places: tuple[Place, ...]) -> Matrix:
    """Lengths in meters of the routes the robot would plan between places, doors open; infinite where there is none."""
    from runner.site.floor import cell_of, clearance, inscribed_radius, rasterize
    from runner.site.routes import find_route, weight_from_clearance

    radius = inscribed_radius(mission.robot.footprint)
    weight = weight_from_clearance(clearance(rasterize(mission.site).blocked()), radius, 2.0 * radius, 3.0)
    cells = [cell_of((place.pose.x, place.pose.y)) for place in places]
    rows = [[0.0] * len(places) for _ in places]
    for one, other in combinations(range(len(places)), 2):
        route = find_route(weight, cells[one], cells[other])
        rows[one][other] = rows[other][one] = float("inf") if route is None else route.length
    return tuple(tuple(row) for row in rows)


def shortest_order(lengths: Matrix, exact_most: int = EXACT_MOST) -> list[int]:
    """The order of all places but the first, 0, such that the open path from 0 through them is short.

    Up to `exact_most` places besides the first it is the shortest there is; memory doubles with each place.
    """
    count = len(lengths) - 1
    if count <= 1:
        return list(range(1, count + 1))
    return _held_karp(lengths) if count <= exact_most else _two_opt(lengths)


def path_length(lengths: Matrix, order: Sequence[int]) -> float:
    """The length of the open path from place 0 through `order`."""
    return sum(lengths[one][other] for one, other in zip((0, *order), order, strict=False))


def _held_karp(lengths: Matrix) -> list[int]:
    """Best path over every set of places and every last one, all sets of one size at a time; ties go to the order
    listed. `best[visited, last]` is the shortest path from place 0 through a set of others, as bits, to the last."""
    import numpy as np

    table = np.array(lengths, dtype=np.float64)
    count = len(lengths) - 1
    sets = np.arange(1 << count)
    sizes = sum((sets >> member) & 1 for member in range(count))
    best = np.full((1 << count, count), np.inf)
    before = np.full((1 << count, count), -1, dtype=np.int8)
    best[1 << np.arange(count), np.arange(count)] = table[0, 1:]
    for size in range(2, count + 1):
        of_size = sets[sizes == size]
        for last in range(count):
            visited = of_size[(of_size >> last) & 1 == 1]
            ways = best[visited ^ (1 << last)] + table[1:, last + 1]
            before[visited, last] = ways.argmin(axis=1)
            best[visited, last] = ways.min(axis=1)
    everything = (1 << count) - 1
    order: list[int] = []
    visited, last = everything, int(best[everything].argmin())
    while last >= 0:
        order.append(last + 1)
        visited, last = visited & ~(1 << last), int(before[visited, last])
    return order[::-1]


def _two_opt(lengths: Matrix) -> list[int]:
    """Turn stretches around while that makes the path shorter; lengths are the same both ways."""
    order = _nearest_next(lengths)
    improved = True
    while improved:
        improved = False
        for start, stop in combinations(range(len(order) + 1), 2):
            if _gain(lengths, order, start, stop) > 1e-9:
                order[start:stop] = order[start:stop][::-1]
                improved = True
    return order


def _gain(lengths: Matrix, order: list[int], start: int, stop: int) -> float:
    """By how much the path gets shorter when order[start:stop] is turned around."""
    before = order[start - 1] if start else 0
    first, last = order[start], order[stop - 1]
    gain = lengths[before][first] - lengths[before][last]
    if stop < len(order):
        gain += lengths[last][order[stop]] - lengths[first][order[stop]]
    return gain


def _nearest_next(lengths: Matrix) -> list[int]:
    left, order, here = set(range(1, len(lengths))), [], 0
    while left:
        here = min(left, key=lambda place: (lengths[here][place], place))
        left.remove(here)
        order.append(here)
    return order
