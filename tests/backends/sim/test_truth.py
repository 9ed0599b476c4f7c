"""Nothing solid is driven through and nobody touched, judged by shapely and not by the simulator's own kernels."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from backends.contract import Goal
from backends.sim.body import SOLID, Body
from runner.site.values import CELL_M, Carton, DoorChange, Pose, Walkers
from tests.backends.sim.support import CART, TWO_ROOMS, Drive, is_end, start

CONTACT_M = 1e-6
"""Overlaps no deeper than this are rounding."""


def solid_cells(drive: Drive) -> list[shapely.Geometry]:
    """The squares of the blocked cells within reach of the robot."""
    x, y, _ = drive.simulator.body.place
    blocked = drive.simulator.world.blocked
    low_row, low_column = max(int((y - 0.6) / CELL_M), 0), max(int((x - 0.6) / CELL_M), 0)
    part = blocked[low_row : low_row + 25, low_column : low_column + 25]
    return [
        shapely.box(c * CELL_M, r * CELL_M, (c + 1) * CELL_M, (r + 1) * CELL_M)
        for r, c in np.add(np.argwhere(part), (low_row, low_column))
    ]


def footprint(body: Body) -> shapely.Polygon:
    x, y, heading = body.place
    turned = shapely.affinity.rotate(shapely.Polygon(CART.footprint), heading, origin=(0, 0), use_radians=True)
    return shapely.affinity.translate(turned, x, y).buffer(-CONTACT_M)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_in_a_busy_place_the_true_footprint_overlaps_nothing_solid_and_nobody(seed: int) -> None:
    drive = start(
        TWO_ROOMS,
        Pose(2.0, 2.0, 0.0),
        seed=seed,
        cartons=[Carton((9.0, 4.0), (0.5, 0.5), 20.0, 120.0), Carton((4.5, 2.0), (0.4, 0.6), 0.0, None, 1.0, 30.0)],
        doors=[DoorChange("south door", 30.0, False), DoorChange("south door", 70.0, True)],
        walkers=[Walkers(5)],
    )
    simulator = drive.simulator
    simulator.go(Goal(1, TWO_ROOMS.places[1].pose, 0.8))
    goals, checked = 1, 0
    for tick in range(1, 3001):
        ended = any(is_end(report) for report in simulator.reports(tick / 10))
        if ended or tick % 600 == 0:
            goals += 1
            simulator.clear(goals, 2.0)
            simulator.go(Goal(goals, TWO_ROOMS.places[goals % 4].pose, 0.8))
        if tick % 300 == 0:
            simulator.ease_back(1000 + tick, 0.5)
        shape = footprint(simulator.body)
        near = solid_cells(drive)
        assert not shapely.intersects(shape, shapely.union_all(near)), f"tick {tick}: {simulator.body.pose}"
        for x, y, radius in simulator.people.bodies:
            assert shape.distance(shapely.Point(x, y)) >= radius - 1e-5, f"tick {tick}: a person at {x}, {y}"
        checked += bool(near)
    assert goals >= 4
    assert checked > 50


def test_people_walk_about_and_never_inside_walls() -> None:
    drive = start(TWO_ROOMS, Pose(4.5, 4.5, 0.0), walkers=[Walkers(6)])
    people = drive.simulator.people
    places = [people.bodies.copy()]
    for second in range(1, 121):
        drive.until(float(second))
        places.append(people.bodies.copy())
        rows, columns = (people.bodies[:, 1] / CELL_M).astype(int), (people.bodies[:, 0] / CELL_M).astype(int)
        assert not drive.simulator.world.blocked[rows, columns].any()
    walked = np.hypot(*np.diff(np.array(places)[:, :, :2], axis=0).transpose(2, 0, 1))
    assert (walked.sum(axis=0) > 5.0).sum() >= 4
    assert walked.max() <= 1.3 * 2.0 * 1.34


def test_the_wheels_stop_dead_at_a_wall_the_robot_does_not_believe_in() -> None:
    drive = start(TWO_ROOMS, Pose(4.0, 4.0, 0.0))
    body, simulator = drive.simulator.body, drive.simulator
    for _ in range(80):
        body.advance(simulator.world, simulator.people.bodies, 0.8, 0.0, 0.0, 0.1)
    assert body.met == SOLID
    assert body.drive.still
    assert 6.9 <= body.place[0] + 0.35 <= 6.9501
