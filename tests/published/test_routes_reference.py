"""Weighted routes against independent implementations and small sums done by hand.

- Edge cost is the mean of two weights times the length: [[1, 2], [3, 4]] from corner to corner costs 2.5 * sqrt(2) =
  3.5355339, the value scikit-image's MCP_Geometric gives as well.
- A 3 x 3 grid of ones with 9 in the middle, corner to corner: around the middle by one diagonal, 2 + sqrt(2) =
  3.4142136, as scikit-image gives.
- Random weighted grids: scipy's csgraph.dijkstra (scipy 1.17.1) on the graph built in tests/site/grids.py.
"""

from __future__ import annotations

import numpy as np
import pytest
from skimage.graph import MCP_Geometric

from runner.site.routes import costs_ahead, find_route
from tests.site.grids import least_costs, random_weights


def test_a_diagonal_costs_the_mean_of_its_two_cells_times_root_two() -> None:
    route = find_route(np.array([[1.0, 2.0], [3.0, 4.0]]), (0, 0), (1, 1))
    assert route is not None
    assert route.cost == pytest.approx(3.5355339, abs=1e-7)


def test_a_dear_middle_is_driven_around() -> None:
    weight = np.ones((3, 3))
    weight[1, 1] = 9.0
    route = find_route(weight, (0, 0), (2, 2))
    assert route is not None
    assert route.cost == pytest.approx(3.4142136, abs=1e-7)


@pytest.mark.parametrize("most", [1.0, 10.0, 1e5])
@pytest.mark.parametrize("blocked_share", [0.0, 0.2, 0.3])
def test_costs_equal_scipys_dijkstra_on_random_weighted_grids(blocked_share: float, most: float) -> None:
    for seed in range(12):
        weight = random_weights(seed, (37, 53), blocked_share, most)
        costs = least_costs(weight, (0, 0))
        for goal in ((36, 52), (18, 26), (0, 52), (36, 0)):
            route = find_route(weight, (0, 0), goal)
            if route is None:
                assert np.isinf(costs[goal]) or np.isinf(weight[goal])
            else:
                assert route.cost == pytest.approx(costs[goal], rel=1e-9)


def test_costs_equal_scikit_images_where_no_corner_can_be_cut() -> None:
    weight = random_weights(4, (60, 80), 0.0)
    costs, _ = MCP_Geometric(weight).find_costs([(0, 0)], [(59, 79)])
    route = find_route(weight, (0, 0), (59, 79))
    assert route is not None
    assert route.cost == pytest.approx(costs[59, 79], rel=1e-9)


@pytest.mark.parametrize("raised_share", [0.0, 0.05, 0.4])
def test_costs_equal_scipys_dijkstra_where_the_search_is_told_the_costs_ahead_before_weights_rose(
    raised_share: float,
) -> None:
    for seed in range(12):
        before = random_weights(seed, (37, 53), 0.15)
        generator = np.random.Generator(np.random.PCG64(seed))
        rose = generator.random(before.shape) < raised_share
        weight = np.where(rose, before * generator.choice([1.0, 3.0, np.inf], before.shape), before)
        for goal in ((36, 52), (18, 26), (0, 52)):
            costs = least_costs(weight, (0, 0))
            route = find_route(weight, (0, 0), goal, costs_ahead(before, goal))
            if route is None:
                assert np.isinf(costs[goal]) or np.isinf(weight[goal]) or np.isinf(weight[0, 0])
            else:
                assert route.cost == pytest.approx(costs[goal], rel=1e-9)
