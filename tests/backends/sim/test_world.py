"""What is there, and when: doors by their hours and by the conditions, cartons that come and go."""

from __future__ import annotations

import math
from datetime import datetime

import numpy as np
import pytest

from backends.sim.kernels.errands import in_sight
from backends.sim.world import FIELD_REACH_M
from runner.site.floor import clearance
from runner.site.values import CELL_M, Carton, Door, DoorChange, Place, Pose, Site, Walkers, Wall
from tests.backends.sim.support import HALL, TWO_ROOMS, Drive, box, go, start

DAY_DOOR = Site(
    "door with hours", 10.0, 6.0, (box(10.0, 6.0), Wall(((5.0, 0.0), (5.0, 6.0)), 0.1)), (),
    (Door("gate", (5.0, 2.0), (5.0, 3.2), 0.1, ((22 * 3600.0, 6 * 3600.0),)),),
    (Place("west", Pose(2.0, 2.6, 0.0)), Place("east", Pose(8.0, 2.6, 0.0))),
)  # fmt: skip
GATE = (5.0, 2.6)


def is_solid(drive: Drive, x: float, y: float) -> bool:
    return bool(drive.simulator.world.blocked[int(y / CELL_M), int(x / CELL_M)])


def test_a_door_is_shut_in_its_hours_over_midnight() -> None:
    drive = start(DAY_DOOR, Pose(2.0, 2.6, 0.0), begins=datetime(2026, 1, 5, 21, 59, 30))
    assert not is_solid(drive, *GATE)
    drive.until(31.0)
    assert is_solid(drive, *GATE)
    assert is_solid(start(DAY_DOOR, Pose(2.0, 2.6, 0.0), begins=datetime(2026, 1, 5, 5, 59)), *GATE)
    assert not is_solid(start(DAY_DOOR, Pose(2.0, 2.6, 0.0), begins=datetime(2026, 1, 5, 6, 0)), *GATE)


def test_a_change_of_the_conditions_goes_before_the_hours() -> None:
    changes = [DoorChange("gate", 10.0, False), DoorChange("gate", 20.0, True)]
    drive = start(DAY_DOOR, Pose(2.0, 2.6, 0.0), doors=changes, begins=datetime(2026, 1, 5, 21, 59, 45))
    solid = []
    for second in (9.0, 11.0, 21.0):
        drive.until(second)
        solid.append(is_solid(drive, *GATE))
    assert solid == [False, True, False]


def test_a_door_waits_for_the_robot_in_it() -> None:
    drive = start(DAY_DOOR, Pose(4.9, 2.6, 0.0), doors=[DoorChange("gate", 1.0, False)])
    drive.until(5.0)
    assert not is_solid(drive, *GATE)
    go(drive, 1, Pose(8.0, 2.6, 0.0))
    drive.until_end(30.0)
    assert is_solid(drive, *GATE)


def test_a_carton_stands_from_and_until() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0), cartons=[Carton((6.0, 4.0), (0.4, 0.4), 5.0, 10.0)])
    solid = []
    for second in (4.9, 5.1, 9.9, 10.1):
        drive.until(second)
        solid.append(is_solid(drive, 6.0, 4.0))
    assert solid == [False, True, True, False]


def test_a_carton_is_put_down_when_the_robot_comes_near_and_stays_for_its_time() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0), cartons=[Carton((9.0, 4.0), (0.4, 0.4), when_near=2.0, stays_s=15.0)])
    go(drive, 1, Pose(10.5, 4.0, 0.0))
    put_down = taken = None
    for tick in range(600):
        drive.until(tick / 10)
        if put_down is None and is_solid(drive, 9.0, 4.0):
            put_down = tick / 10
            assert math.dist(drive.simulator.body.place[:2], (9.0, 4.0)) == pytest.approx(2.0, abs=0.2)
        if put_down is not None and taken is None and not is_solid(drive, 9.0, 4.0):
            taken = tick / 10
    assert put_down is not None
    assert taken == pytest.approx(put_down + 15.0, abs=0.15)


def test_the_distance_field_stays_exact_up_to_its_reach_when_things_come_and_go() -> None:
    cartons = [
        Carton((3.0, 3.0), (0.5, 0.3), 1.0, 8.0),
        Carton((6.5, 8.7), (0.3, 0.3), 2.0),
        Carton((0.3, 0.3), (0.3, 0.3), 3.0),
    ]
    drive = start(TWO_ROOMS, Pose(10.0, 4.0, 0.0), cartons=cartons, doors=[DoorChange("north door", 5.0, False)])
    for second in (0.0, 1.5, 2.5, 3.5, 5.5, 8.5):
        drive.until(second)
        world = drive.simulator.world
        np.testing.assert_array_equal(world.distance, np.minimum(clearance(world.blocked), np.float32(FIELD_REACH_M)))


def test_people_walk_only_between_the_places_named() -> None:
    drive = start(TWO_ROOMS, Pose(12.0, 7.0, 0.0), walkers=[Walkers(4, between=("west", "middle"))])
    for second in range(1, 90):
        drive.until(float(second))
        assert (drive.simulator.people.bodies[:, 0] < 7.0).all()


def test_people_need_places_that_there_are() -> None:
    with pytest.raises(ValueError, match='places that the site does not have: "attic"'):
        start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), walkers=[Walkers(1, between=("attic",))])


def test_sight_ends_at_walls() -> None:
    distance = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0)).simulator.world.distance
    assert in_sight(distance, 5.0, 2.1, 9.0, 2.1, 0.3)
    assert not in_sight(distance, 5.0, 4.0, 9.0, 4.0, 0.3)
    assert not in_sight(distance, 5.0, 2.1, 9.0, 2.1, 0.7)


def test_a_change_of_a_door_that_is_not_there_is_refused() -> None:
    with pytest.raises(ValueError, match='a door that the site does not have: "trap"'):
        start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), doors=[DoorChange("trap", 1.0, True)])
