"""Clearance against distances that can be written down.

One blocked cell at the center of a 7 x 7 grid, its distances by Pythagoras: 3 * sqrt(2) cells at the corner, 3 at the
middle of an edge, sqrt(5) a knight's move away; `scipy.ndimage.distance_transform_edt` (scipy 1.17.1) gives the same.
Here the outside counts as blocked, so the 7 x 7 grid lies in the middle of a much larger free floor.

Of the map room-32-32-4 (Sturtevant, see test_routes_movingai), with cells of side 1, scipy gives as largest distance
3.1622777, as sum 809.543246, and 81 cells of at least 2.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.ndimage import distance_transform_edt

from backends.sim.memory import Memory
from backends.sim.outline import outline_of
from backends.sim.sensing import Scan
from backends.sim.world import World
from runner.site.floor import clearance
from runner.site.values import CELL_M, Carton, Conditions, Lidar, Pose, Site
from tests.open_data import open_data
from tests.published.test_routes_movingai import read_map


@pytest.mark.parametrize(
    ("row", "column", "cells"), [(0, 0, 4.2426407), (3, 0, 3.0), (1, 2, 2.2360680), (3, 3, 0.0), (2, 2, 1.4142136)]
)
def test_distances_from_a_single_blocked_cell_are_euclidean(row: int, column: int, cells: float) -> None:
    blocked = np.zeros((27, 27), dtype=np.bool_)
    blocked[13, 13] = True
    assert clearance(blocked)[10 + row, 10 + column] == pytest.approx(cells * CELL_M, abs=1e-7)


def test_a_corner_cell_of_the_small_grid_is_21_centimeters_away() -> None:
    blocked = np.zeros((27, 27), dtype=np.bool_)
    blocked[13, 13] = True
    assert clearance(blocked)[10, 10] == pytest.approx(0.2121320, abs=1e-7)


def test_a_published_map_has_the_distances_that_scipy_gives() -> None:
    passable = np.isfinite(read_map(open_data("movingai") / "mapf_room-32-32-4.map"))
    blocked = np.pad(~passable, 40, constant_values=False)
    cells = clearance(blocked)[40:-40, 40:-40] / CELL_M
    assert cells.max() == pytest.approx(3.1622777, abs=1e-5)
    assert cells.sum() == pytest.approx(809.543246, abs=1e-3)
    assert np.count_nonzero(cells >= 2.0 - 1e-5) == 81


def by_scipy(blocked: NDArray[np.bool_]) -> NDArray[np.float64]:
    """Meters to the nearest blocked cell, the outside counting as blocked."""
    free = np.pad(~blocked, 1, constant_values=False)
    distances: NDArray[np.float64] = distance_transform_edt(free)[1:-1, 1:-1] * CELL_M
    return distances


def test_the_field_of_the_world_is_scipys_up_to_its_reach_after_things_came_and_went() -> None:
    floor = Site("floor", 6.0, 5.0, (), (), (), ())
    cartons = (
        Carton((2.0, 2.0), (0.4, 0.6), 1.0, 5.0),
        Carton((4.2, 3.1), (0.3, 0.3), 2.0),
        Carton((1.0, 4.0), (0.5, 0.2)),
    )
    world = World(floor, Conditions(cartons=cartons), 0.0)
    outline = outline_of(((0.1, 0.1), (-0.1, 0.1), (-0.1, -0.1), (0.1, -0.1)))
    for second in range(8):
        world.advance(float(second), (5.5, 0.5, 0.0), outline, np.zeros((0, 3)), True)
        np.testing.assert_allclose(world.distance, np.minimum(by_scipy(world.blocked), 2.0), atol=1e-6)


def test_the_field_of_the_memory_is_scipys_of_map_and_returns_near_by() -> None:
    """Hits at ranges that fall into known cells: at 1.0 m east and at 1.5 m north of (2.025, 2.025)."""
    outline = outline_of(((0.3, 0.2), (-0.3, 0.2), (-0.3, -0.2), (0.3, -0.2)))
    memory = Memory(np.zeros((80, 80), dtype=np.bool_), outline, Lidar(6.0, 4, 8.0, 10.0, 0.0))
    ranges = np.array([1.0, 1.5, np.inf, np.inf])
    memory.take(Scan(ranges, 0.0, np.pi / 2.0, 0.0, sight=ranges), Pose(2.025, 2.025, 0.0))
    blocked = np.zeros((80, 80), dtype=np.bool_)
    blocked[40, 60] = blocked[70, 40] = True
    near = by_scipy(blocked)
    reach = near <= 0.5
    np.testing.assert_allclose(memory.field[reach], near[reach], atol=1e-6)
