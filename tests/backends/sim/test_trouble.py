"""The robot gets into the trouble that real ones get into, and out of it by what gets real ones out."""

from __future__ import annotations

import pytest

from backends.contract import GoalStatus
from runner.site.values import Bystander, Carton, Conditions, DoorChange, Place, Pose, Site, Wall
from tests.backends.sim.support import CORRIDOR, TWO_ROOMS, Drive, box, go, start

NARROW = Site(
    "narrow corridor", 40.0, 4.0,
    (box(40.0, 4.0), Wall(((0.0, 1.3), (40.0, 1.3)), 0.2), Wall(((0.0, 2.7), (40.0, 2.7)), 0.2)),
    (), (), (Place("west", Pose(2, 2, 0)), Place("east", Pose(38, 2, 0))),
)  # fmt: skip
"""1.2 m wide."""
EAST = Pose(37.0, 2.0, 0.0)
SHUT_SOUTH, SHUT_NORTH = DoorChange("south door", 0.0, False), DoorChange("north door", 0.0, False)


def blocked_corridor(seed: int, until: float) -> Drive:
    """A carton fills the corridor until a time; the robot is on its way."""
    drive = start(NARROW, Pose(2.0, 2.0, 0.0), seed=seed, cartons=[Carton((20.0, 2.0), (0.5, 1.1), 0.0, until)])
    go(drive, 1, EAST)
    return drive


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_a_carton_in_the_only_corridor_ends_the_leg_with_no_route(seed: int) -> None:
    drive = blocked_corridor(seed, 1000.0)
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is GoalStatus.NO_ROUTE
    assert end.reason == "Something that the map does not know stands in every way to the goal."
    assert 17.0 < drive.simulator.body.pose.x < 19.75 - 0.35
    standing = [one.remaining for one in drive.telemetry() if one.speed == 0.0 and one.stamp > 20.0]
    assert len(set(standing)) <= 3 or max(map(float, filter(None, standing)), default=0.0) > 0.0


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_a_carton_that_was_taken_away_stays_remembered_until_the_robot_clears(seed: int) -> None:
    drive = blocked_corridor(seed, 60.0)
    assert drive.until_end(50.0) is not None
    drive.until(180.0)
    go(drive, 2, EAST)
    end = drive.until_end(200.0)
    assert end is not None
    assert end.status is GoalStatus.NO_ROUTE
    drive.simulator.clear(1, 3.0)
    go(drive, 3, EAST)
    end = drive.until_end(300.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED


def test_a_carton_that_still_stands_is_seen_again_after_clearing() -> None:
    drive = blocked_corridor(1, 1000.0)
    drive.until_end(60.0)
    drive.simulator.clear(1, 3.0)
    assert drive.simulator.memory.count == 0
    go(drive, 2, EAST)
    end = drive.until_end(120.0)
    assert end is not None
    assert end.status is GoalStatus.NO_ROUTE


def test_a_carton_beside_the_way_is_driven_round() -> None:
    drive = start(CORRIDOR, Pose(2.0, 2.0, 0.0), cartons=[Carton((20.0, 2.5), (0.5, 0.6))])
    go(drive, 1, EAST)
    end = drive.until_end(90.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert any(one.obstacles for one in drive.telemetry())


def test_obstacles_are_reported_where_the_carton_is_and_nowhere_else() -> None:
    drive = start(CORRIDOR, Pose(16.0, 2.0, 0.0), cartons=[Carton((19.0, 2.0), (0.4, 0.8))])
    drive.until(3.0)
    points = drive.telemetry()[-1].obstacles
    assert 8 <= len(points) <= 64
    for x, y in points:
        assert 18.65 < x < 19.35
        assert 1.45 < y < 2.55


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_a_shut_door_is_met_and_the_other_way_round_is_taken(seed: int) -> None:
    drive = start(TWO_ROOMS, Pose(1.2, 1.2, 0.0), seed=seed, doors=[SHUT_SOUTH])
    go(drive, 1, Pose(12.0, 2.0, 0.0))
    end = drive.until_end(120.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert drive.telemetry()[-1].route_number == 2


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_with_both_doors_shut_there_is_no_route(seed: int) -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, doors=[SHUT_SOUTH, SHUT_NORTH])
    go(drive, 1, Pose(12.0, 2.0, 0.0))
    end = drive.until_end(180.0)
    assert end is not None
    assert end.status is GoalStatus.NO_ROUTE
    assert drive.simulator.body.pose.x < 7.0


def test_a_person_who_stands_in_the_doorway_holds_the_robot_up_untouched() -> None:
    standing = Conditions(bystanders=(Bystander((7.0, 2.1)),))
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), doors=[SHUT_NORTH], conditions=standing)
    people = drive.simulator.people
    go(drive, 1, Pose(12.0, 2.0, 0.0))
    drive.until_end(120.0)
    assert GoalStatus.ARRIVED not in drive.statuses()
    assert tuple(people.bodies[0, :2]) == (7.0, 2.1)
    assert drive.simulator.body.pose.x < 7.0
    people.bodies[0, :2] = (2.0, 7.9)
    drive.simulator.clear(1, 10.0)
    go(drive, 2, Pose(12.0, 2.0, 0.0))
    end = drive.until_end(240.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED


def test_something_on_the_goal_is_named_as_the_reason() -> None:
    drive = start(CORRIDOR, Pose(2.0, 2.0, 0.0), cartons=[Carton((12.0, 2.0), (0.4, 0.4))])
    go(drive, 1, Pose(12.0, 2.0, 0.0))
    end = drive.until_end(60.0)
    assert end is not None
    assert (end.status, end.reason) == (
        GoalStatus.NO_ROUTE,
        "Something that the map does not know stands at the goal.",
    )


def test_routes_do_not_flip_to_and_fro() -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), doors=[SHUT_SOUTH, SHUT_NORTH])
    go(drive, 1, Pose(12.0, 2.0, 0.0))
    drive.until_end(180.0)
    assert drive.telemetry()[-1].route_number <= 3
