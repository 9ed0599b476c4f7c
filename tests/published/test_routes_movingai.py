"""Route lengths against the published optimum of every problem of three grid maps.

Source: N. Sturtevant, "Benchmarks for Grid-Based Pathfinding", IEEE Transactions on Computational Intelligence and AI
in Games 4(2), 2012, 144-148; data under the Open Data Commons Attribution License. Eight neighbors, a diagonal costs
the square root of 2 and may not cut a corner; (0, 0) is the upper left; `.` `G` `S` are passable.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from runner.site.routes import find_route
from runner.site.values import CELL_M
from tests.open_data import open_data

MAPS = {"mapf_room-32-32-4": 130, "mapf_maze-32-32-4": 200, "mapf_warehouse-10-20-10-2-1": 450}


def read_map(path: Path) -> NDArray[np.float32]:
    rows = path.read_text().splitlines()[4:]
    passable = np.array([[character in ".GS" for character in row] for row in rows])
    return np.where(passable, 1.0, np.inf).astype(np.float32)


@pytest.mark.parametrize("name", MAPS)
def test_every_problem_of_the_map_is_solved_at_its_published_optimum(name: str) -> None:
    folder = open_data("movingai")
    weight = read_map(folder / f"{name}.map")
    problems = (folder / f"{name}-even-1.scen").read_text().splitlines()[1:]
    assert len(problems) == MAPS[name]
    for problem in problems:
        *_, start_x, start_y, goal_x, goal_y, optimum = problem.split("\t")
        route = find_route(weight, (int(start_y), int(start_x)), (int(goal_y), int(goal_x)))
        assert route is not None, problem
        assert route.cost == pytest.approx(float(optimum), abs=1e-6), problem
        assert route.length / CELL_M == pytest.approx(float(optimum), abs=1e-6), problem
