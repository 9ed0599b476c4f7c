"""Routes between the places of a mission, for checks: planned as a robot would, without waiting for a compiler.

On every second cell, with the weights of `runner.site.routes`, for a disc of the inscribed radius and doors open. One
search from a place gives the routes to all others (Dijkstra, 1959, as scipy has it). With them goes a bound: no way
the disc could take is shorter than `least`.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from runner.site.floor import Cell, cell_of, circumscribed_radius, inscribed_radius
from runner.site.routes import weight_from_clearance
from runner.site.values import CELL_M, Point

COARSE, ROUGH = 2, 4
"""Cells to a side of what routes are planned on, and of what the bound is taken from."""
SOFT_M = 0.3
STRENGTH = 8.0
"""A route likes so much more clearance than the circumscribed radius; the tightest cell is so much dearer."""
GRID_EXCESS = 1.0 / math.cos(math.pi / 8.0)
"""A way in steps to eight neighbors is at most so much longer than the straight one: 1.0824."""
SLACK_M = 0.75
"""What cells that are 20 cm wide and arrivals a little off their place take off the bound."""
REACH_CELLS = 3
"""How far from its own cell, in coarse cells, a route may begin or end where that one is too tight."""


@dataclass(frozen=True, slots=True)
class Way:
    """A route: its points (n, 2), meters; its length; and what no way is shorter than. Infinite where there is none."""

    points: NDArray[np.float64]
    length: float
    least: float

    @property
    def exists(self) -> bool:
        return math.isfinite(self.length)


NO_WAY = Way(np.empty((0, 2)), math.inf, math.inf)


def plan_ways(
    clearance: NDArray[np.float32], footprint: Sequence[Point], pairs: Iterable[tuple[Point, Point]]
) -> dict[tuple[Point, Point], Way]:
    """The way from each point to its other, for every pair; `NO_WAY` where there is none."""
    wanted = list(dict.fromkeys(pairs))
    hard = inscribed_radius(footprint) + CELL_M
    weight = _pooled(weight_from_clearance(clearance, hard, circumscribed_radius(footprint) + SOFT_M, STRENGTH), COARSE)
    rough = np.where(np.isfinite(_pooled(np.where(clearance >= hard - CELL_M, 1.0, np.inf), ROUGH)), 1.0, np.inf)
    routes = _search(weight, COARSE, wanted)
    bounds = _search(rough, ROUGH, wanted)
    return {pair: _way(pair, routes.get(pair), bounds.get(pair)) for pair in wanted}


def _way(pair: tuple[Point, Point], route: NDArray[np.intp] | None, bound: NDArray[np.intp] | None) -> Way:
    if route is None:
        return NO_WAY
    straight = math.dist(*pair)
    by_grid = 0.0 if bound is None else _length(bound, ROUGH) / GRID_EXCESS
    points = (route[:, ::-1].astype(np.float64) + 0.5) * (COARSE * CELL_M)
    points = np.vstack([pair[0], points[1:-1], pair[1]])
    length = float(np.hypot(*np.diff(points, axis=0).T).sum())
    return Way(points, length, max(0.0, max(by_grid, straight) - SLACK_M))


def _length(cells: NDArray[np.intp], size: int) -> float:
    return float(np.hypot(*np.diff(cells, axis=0).T).sum()) * size * CELL_M


def _pooled(weight: NDArray[np.floating], size: int) -> NDArray[np.float64]:
    """The least weight of each block of cells."""
    rows, columns = (-(-side // size) for side in weight.shape)
    padded = np.full((rows * size, columns * size), np.inf)
    padded[: weight.shape[0], : weight.shape[1]] = weight
    return np.asarray(padded.reshape(rows, size, columns, size).min(axis=(1, 3)))


def _search(
    weight: NDArray[np.float64], size: int, pairs: Sequence[tuple[Point, Point]]
) -> dict[tuple[Point, Point], NDArray[np.intp]]:
    """Cells of the cheapest way of each pair that has one."""
    from scipy.sparse.csgraph import dijkstra

    columns = weight.shape[1]
    ends = {point: _open_cell(weight, point, size) for pair in pairs for point in pair}
    hubs = _hubs([pair for pair in pairs if ends[pair[0]] is not None and ends[pair[1]] is not None])
    if not hubs:
        return {}
    numbers = np.cumsum(np.isfinite(weight).ravel()) - 1
    cells = np.flatnonzero(np.isfinite(weight).ravel())
    graph = _graph(weight, numbers)
    found: dict[tuple[Point, Point], NDArray[np.intp]] = {}
    for hub, others in hubs.items():
        source = int(numbers[_flat(ends[hub], columns)])
        _, before = dijkstra(graph, directed=False, indices=source, return_predecessors=True)
        for pair in others:
            other = pair[1] if pair[0] == hub else pair[0]
            way = _unwind(before, source, int(numbers[_flat(ends[other], columns)]))
            if way is not None:
                ordered = cells[way if pair[0] == hub else way[::-1]]
                found[pair] = np.stack(np.divmod(ordered, columns), axis=1)
    return found


def _flat(cell: Cell | None, columns: int) -> int:
    assert cell is not None, "pairs with an end in a wall were left out"
    return cell[0] * columns + cell[1]


def _open_cell(weight: NDArray[np.float64], point: Point, size: int) -> Cell | None:
    """The open cell nearest to a point, None where none is near."""
    row, column = (index // size for index in cell_of(point))
    near = [
        (abs(r - row) + abs(c - column), r, c)
        for r in range(max(row - REACH_CELLS, 0), min(row + REACH_CELLS + 1, weight.shape[0]))
        for c in range(max(column - REACH_CELLS, 0), min(column + REACH_CELLS + 1, weight.shape[1]))
        if math.isfinite(weight[r, c])
    ]
    return min(near)[1:] if near else None


def _hubs(pairs: Sequence[tuple[Point, Point]]) -> dict[Point, list[tuple[Point, Point]]]:
    """Points to search from, each with the pairs it serves: ways lead both ways, so few points serve all pairs."""
    left = list(pairs)
    hubs: dict[Point, list[tuple[Point, Point]]] = {}
    while left:
        counts: dict[Point, int] = {}
        for pair in left:
            for point in set(pair):
                counts[point] = counts.get(point, 0) + 1
        hub = max(counts, key=lambda point: counts[point])
        hubs[hub] = [pair for pair in left if hub in pair]
        left = [pair for pair in left if hub not in pair]
    return hubs


def _graph(weight: NDArray[np.float64], numbers: NDArray[np.intp]) -> object:
    """The neighbors of the open cells; a step costs the mean of both weights times its length, and cuts no corner."""
    from scipy.sparse import coo_matrix

    rows, columns = weight.shape
    index = numbers.reshape(weight.shape)
    open_ = np.isfinite(weight)
    parts = []
    for row_step, column_step in ((0, 1), (1, 0), (1, 1), (1, -1)):
        one = np.s_[: rows - row_step, max(-column_step, 0) : columns - max(column_step, 0)]
        two = np.s_[row_step:, max(column_step, 0) : columns + min(column_step, 0)]
        joined = open_[one] & open_[two]
        if row_step and column_step:
            joined &= open_[: rows - 1, two[1]] & open_[1:, one[1]]
        cost = 0.5 * (weight[one][joined] + weight[two][joined]) * math.hypot(row_step, column_step)
        parts.append((index[one][joined], index[two][joined], cost))
    begins, ends, costs = (np.concatenate(part) for part in zip(*parts, strict=True))
    count = int(np.count_nonzero(open_))
    return coo_matrix((costs, (begins, ends)), shape=(count, count)).tocsr()


def _unwind(before: NDArray[np.int32], source: int, node: int) -> NDArray[np.intp] | None:
    """Nodes from the source to a node; None where there is no way."""
    way = [node]
    while node != source:
        node = int(before[node])
        if node < 0:
            return None
        way.append(node)
    return np.array(way[::-1], dtype=np.intp)
