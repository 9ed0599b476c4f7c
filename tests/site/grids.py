"""Grids for tests of routes, and the least costs on them by scipy's Dijkstra as the independent answer."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import dijkstra


def random_weights(seed: int, shape: tuple[int, int], blocked_share: float, most: float = 10.0) -> NDArray[np.float64]:
    """Weights between 1 and `most`, a share of the cells blocked, both far corners open."""
    random = np.random.default_rng(seed)
    weight = random.uniform(1.0, most, shape)
    weight[random.random(shape) < blocked_share] = np.inf
    weight[0, 0] = weight[-1, -1] = 1.0
    return weight


def graph_of(weight: NDArray[np.float64]) -> coo_array:
    """The 8-connected grid as a sparse graph: mean weight times length, a diagonal only between two free sides."""
    rows, columns = weight.shape
    number = np.arange(rows * columns).reshape(rows, columns)
    free = np.isfinite(weight)
    starts, ends, costs = [], [], []
    for down, right in ((0, 1), (1, 0), (1, 1), (1, -1)):
        here = (slice(0, rows - down), slice(max(0, -right), columns - max(0, right)))
        there = (slice(down, rows), slice(max(0, right), columns + min(0, right)))
        passable = free[here] & free[there]
        if down and right:
            passable &= free[here[0], there[1]] & free[there[0], here[1]]
        starts.append(number[here][passable])
        ends.append(number[there][passable])
        costs.append((weight[here][passable] + weight[there][passable]) / 2.0 * np.hypot(down, right))
    edges = (np.concatenate(starts), np.concatenate(ends))
    return coo_array((np.concatenate(costs), edges), shape=(rows * columns, rows * columns))


def least_costs(weight: NDArray[np.float64], start: tuple[int, int]) -> NDArray[np.float64]:
    """The least cost from a cell to every cell, infinite where there is no way."""
    source = start[0] * weight.shape[1] + start[1]
    found = dijkstra(graph_of(weight).tocsr(), directed=False, indices=source)
    return np.asarray(found).reshape(weight.shape)
