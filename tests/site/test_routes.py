"""Routes: what is a legal step, what a route says of itself, and how weights follow from clearance."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from runner.site.routes import find_route, is_joined, regions, weight_from_clearance
from runner.site.values import CELL_M
from tests.site.grids import least_costs, random_weights

SEEDS = st.integers(0, 10_000)


def test_a_route_of_one_cell_has_no_length() -> None:
    route = find_route(np.ones((4, 4)), (2, 1), (2, 1))
    assert route is not None
    assert (route.cells.tolist(), route.cost, route.length) == ([[2, 1]], 0.0, 0.0)


def test_corners_are_not_cut() -> None:
    weight = np.ones((2, 2))
    weight[0, 1] = np.inf
    route = find_route(weight, (0, 0), (1, 1))
    assert route is not None
    assert route.cells.tolist() == [[0, 0], [1, 0], [1, 1]]


def test_two_cells_that_touch_by_a_corner_alone_are_not_connected() -> None:
    weight = np.ones((2, 2))
    weight[0, 1] = weight[1, 0] = np.inf
    assert find_route(weight, (0, 0), (1, 1)) is None
    numbers = regions(np.isfinite(weight))
    assert numbers[0, 0] != numbers[1, 1]


@pytest.mark.parametrize("end", [(0, 3), (-1, 0), (4, 0), (0, 4)])
def test_there_is_no_route_from_or_to_a_blocked_cell_or_off_the_grid(end: tuple[int, int]) -> None:
    weight = np.ones((4, 4))
    weight[0, 3] = np.inf
    assert find_route(weight, (2, 2), end) is None
    assert find_route(weight, end, (2, 2)) is None


def test_a_weight_of_zero_is_refused() -> None:
    with pytest.raises(ValueError, match="above 0"):
        find_route(np.zeros((3, 3)), (0, 0), (2, 2))


def test_a_longer_way_is_taken_where_it_is_cheaper() -> None:
    weight = np.ones((9, 9))
    weight[:6, 4] = 50.0
    route = find_route(weight, (0, 0), (0, 8))
    assert route is not None
    assert route.cells[:, 0].max() >= 6


def test_the_points_of_a_route_are_the_centers_of_its_cells_in_site_coordinates() -> None:
    route = find_route(np.ones((3, 5)), (0, 0), (0, 4))
    assert route is not None
    assert route.points()[-1].tolist() == pytest.approx([4.5 * CELL_M, 0.5 * CELL_M])
    assert route.length == pytest.approx(4 * CELL_M)


@settings(max_examples=60, deadline=None)
@given(seed=SEEDS, blocked=st.floats(0.0, 0.4))
def test_every_route_is_made_of_legal_steps_that_add_up_to_its_cost(seed: int, blocked: float) -> None:
    weight = random_weights(seed, (14, 19), blocked)
    route = find_route(weight, (0, 0), (13, 18))
    if route is None:
        return
    total = 0.0
    cells = [(int(row), int(column)) for row, column in route.cells]
    assert cells[0] == (0, 0)
    assert cells[-1] == (13, 18)
    for (row, column), (next_row, next_column) in pairwise(cells):
        length = math.hypot(next_row - row, next_column - column)
        assert length in (1.0, math.sqrt(2.0))
        assert np.isfinite(weight[next_row, column])
        assert np.isfinite(weight[row, next_column])
        total += length * (weight[row, column] + weight[next_row, next_column]) / 2.0
    assert total == pytest.approx(route.cost, rel=1e-12)


@settings(max_examples=60, deadline=None)
@given(seed=SEEDS, blocked=st.floats(0.2, 0.6))
def test_regions_tell_where_a_route_exists(seed: int, blocked: float) -> None:
    weight = random_weights(seed, (12, 12), blocked)
    numbers = regions(np.isfinite(weight))
    reached = np.isfinite(least_costs(weight, (0, 0)))
    assert np.array_equal(numbers == numbers[0, 0], reached)


@settings(max_examples=60, deadline=None)
@given(seed=SEEDS, blocked=st.floats(0.2, 0.6), row=st.integers(-1, 12), column=st.integers(-1, 12))
def test_two_cells_are_joined_where_a_route_is_found(seed: int, blocked: float, row: int, column: int) -> None:
    weight = random_weights(seed, (12, 12), blocked)
    assert is_joined(weight, (3, 4), (row, column)) == (find_route(weight, (3, 4), (row, column)) is not None)


def test_there_and_back_cost_the_same_and_the_same_question_gives_the_same_cells() -> None:
    weight = random_weights(7, (80, 90), 0.2)
    there, again = find_route(weight, (0, 0), (79, 89)), find_route(weight, (0, 0), (79, 89))
    back = find_route(weight, (79, 89), (0, 0))
    assert there is not None
    assert again is not None
    assert back is not None
    assert np.array_equal(there.cells, again.cells)
    assert back.cost == pytest.approx(there.cost, rel=1e-12)


def test_single_precision_weights_are_summed_in_double_precision() -> None:
    weight = random_weights(11, (200, 300), 0.1).astype(np.float32)
    route = find_route(weight, (0, 0), (199, 299))
    assert route is not None
    assert route.cost == pytest.approx(least_costs(weight.astype(np.float64), (0, 0))[199, 299], rel=1e-12)


def test_weights_are_infinite_near_walls_one_in_the_open_and_fall_smoothly_between() -> None:
    clearance = np.array([[0.1, 0.3, 0.45, 0.6, 2.0]], dtype=np.float32)
    weight = weight_from_clearance(clearance, hard=0.3, soft=0.6, strength=8.0)
    assert weight.tolist() == [[math.inf, pytest.approx(9.0), pytest.approx(3.0), 1.0, 1.0]]
