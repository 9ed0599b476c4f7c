"""A route across a 1000 x 1000 weighted grid, beside scikit-image, scipy and libtcod on the same grid.

Two grids: a floor of rooms and clutter weighted by clearance, which is what the program plans on; and random weights,
where no estimate helps and every cell must be looked at. The peers are given what suits them best: scipy its graph
built beforehand (the time to build it is a row of its own), libtcod whole-number costs. scikit-image cuts corners and
libtcod rounds, so only scipy's cost can be equal to ours to the last digits; the difference is a row.
"""

from __future__ import annotations

import importlib.util
from collections.abc import Callable, Iterator

import numpy as np
from numpy.typing import NDArray
from scipy.sparse.csgraph import dijkstra
from skimage.graph import MCP_Geometric

from runner.site.floor import clearance
from runner.site.routes import find_route, weight_from_clearance
from tests.bench.harness import Row, best_time
from tests.site.grids import graph_of

SIDE = 1000
START, GOAL = (0, 0), (SIDE - 1, SIDE - 1)
TIMES_FASTER = "8 times the fastest"


def measure() -> Iterator[Row]:
    for name, weight in (("floor", cluttered_floor()), ("random weights", random_grid())):
        yield from rows_for(name, weight)


def cluttered_floor() -> NDArray[np.float32]:
    """83 rectangles per quarter million cells (5 cm each), weights up to 9 within 0.8 m of them."""
    random = np.random.default_rng(3)
    blocked = np.zeros((SIDE, SIDE), dtype=np.bool_)
    for _ in range(SIDE * SIDE // 12_000):
        row, column = random.integers(0, SIDE, 2)
        height, width = random.integers(4, 60, 2)
        blocked[row : row + height, column : column + width] = True
    blocked[:8, :8] = blocked[-8:, -8:] = False
    return weight_from_clearance(clearance(blocked), hard=0.01, soft=0.8, strength=8.0)


def random_grid() -> NDArray[np.float32]:
    return np.random.default_rng(5).uniform(1.0, 10.0, (SIDE, SIDE)).astype(np.float32)


def rows_for(name: str, weight: NDArray[np.float32]) -> Iterator[Row]:
    route = find_route(weight, START, GOAL)
    assert route is not None
    ours = best_time(lambda: find_route(weight, START, GOAL), 9)
    exact = weight.astype(np.float64)
    graph = graph_of(exact).tocsr()
    costs = dijkstra(graph, directed=False, indices=0)
    yield Row(
        f"route, {name}: cost", route.cost, "cells", "scipy", float(costs[-1]), route.cost / float(costs[-1]), "1"
    )
    for peer, solve in peers(weight, lambda: dijkstra(graph, directed=False, indices=0)).items():
        seconds = best_time(solve, 3)
        yield Row(f"route, {name}: time", ours * 1e3, "ms", peer, seconds * 1e3, seconds / ours, TIMES_FASTER)
    building = best_time(lambda: graph_of(exact).tocsr(), 1)
    yield Row(f"route, {name}: time", ours * 1e3, "ms", "scipy, building its graph", building * 1e3, building / ours)
    if importlib.util.find_spec("tcod") is None:
        yield Row(f"route, {name}: time", ours * 1e3, "ms", "libtcod (absent: not measured)", goal=TIMES_FASTER)


def peers(weight: NDArray[np.float32], solve_graph: Callable[[], object]) -> dict[str, Callable[[], object]]:
    found: dict[str, Callable[[], object]] = {
        "scipy, graph built before": solve_graph,
        "scikit-image": lambda: MCP_Geometric(weight).find_costs([START], [GOAL]),
    }
    if importlib.util.find_spec("tcod") is not None:
        found["libtcod"] = with_libtcod(weight)
    return found


def with_libtcod(weight: NDArray[np.float32]) -> Callable[[], object]:
    import tcod.path

    tenths = np.where(np.isfinite(weight), np.round(weight * 10.0), 0.0).astype(np.int32)

    def solve() -> object:
        finder = tcod.path.Pathfinder(tcod.path.SimpleGraph(cost=tenths, cardinal=10, diagonal=14))
        finder.add_root(START)
        return finder.path_to(GOAL)

    return solve
