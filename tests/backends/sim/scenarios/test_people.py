"""What people do, and what the robot then does. Each on three seeds."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest

from backends.contract import Cause, GoalStatus
from runner.site.values import (
    AboutShare,
    Bystander,
    Conditions,
    Crowd,
    DoorChange,
    Pose,
    Walkers,
)
from tests.backends.sim.scenarios.watching import SEEDS, drive_leg
from tests.backends.sim.support import HALL, TWO_ROOMS, Drive, go, start

ARRIVED, NO_ROUTE = GoalStatus.ARRIVED, GoalStatus.NO_ROUTE
SHUT_NORTH = DoorChange("north door", 0.0, open=False)
SHUT_SOUTH = DoorChange("south door", 0.0, open=False)
ONE_DOOR = replace(TWO_ROOMS, doors=TWO_ROOMS.doors[:1])
IN_THE_DOOR, LEAVES_S = (7.0, 2.1), 40.0


def seconds(drive: Drive, until: int) -> Iterator[int]:
    """Run second by second."""
    for second in range(math.floor(drive.simulator.clock.now()) + 1, until + 1):
        drive.until(float(second))
        yield second


def about(drive: Drive) -> int:
    """How many people are on the floor."""
    return int((drive.simulator.people.bodies[:, 0] >= 0.0).sum())


def causes(drive: Drive) -> set[Cause]:
    return {truth.cause for truth in drive.simulator.truths()}


def drive_patiently(drive: Drive, pose: Pose, tries: int = 4) -> GoalStatus | None:
    """Drive as a mission would: where the robot does not get on it clears, eases back and tries again."""
    end = None
    for number in range(100, 100 + 2 * tries, 2):
        drive.simulator.clear(number, 8.0)
        drive.simulator.ease_back(number + 1, 0.4)
        drive.until_answer(number + 1, drive.simulator.clock.now() + 10.0)
        end = drive_leg(drive, number, pose, 60.0).end
        if end is ARRIVED:
            break
    return end


@pytest.mark.parametrize("seed", SEEDS)
def test_a_person_in_the_only_doorway_holds_the_robot_up_until_they_leave(seed: int) -> None:
    standing = Conditions(bystanders=(Bystander(IN_THE_DOOR, until_s=LEAVES_S),))
    drive = start(ONE_DOOR, Pose(2.0, 2.0, 0.0), seed=seed, conditions=standing)
    leg = drive_leg(drive, 1, Pose(12.0, 2.0, 0.0), 30.0)
    assert leg.end is NO_ROUTE
    person, robot = drive.simulator.people.bodies[0], drive.simulator.body.pose
    assert tuple(person[:2]) == IN_THE_DOOR, "nobody pushed them"
    assert math.dist(person[:2], (robot.x, robot.y)) > 0.35 + person[2]
    assert robot.x < 6.6
    assert Cause.PERSON in causes(drive)
    drive.until(LEAVES_S + 12.0)
    assert math.dist(drive.simulator.people.bodies[0, :2], IN_THE_DOOR) > 1.0
    assert drive_patiently(drive, Pose(12.0, 2.0, 0.0)) is ARRIVED


@pytest.mark.parametrize("seed", SEEDS)
def test_a_crowd_gathers_round_the_robot_hems_it_in_and_leaves(seed: int) -> None:
    crowd = Conditions(crowds=(Crowd(8, stays_s=30.0, at_s=2.0),))
    drive = start(TWO_ROOMS, Pose(4.0, 4.0, 0.0), seed=seed, conditions=crowd)
    near = []
    for second in seconds(drive, 32):
        bodies, place = drive.simulator.people.bodies, drive.simulator.body.place
        near.append(int((np.hypot(bodies[:, 0] - place[0], bodies[:, 1] - place[1]) < 1.6).sum()))
        if second == 20:
            go(drive, 1, Pose(12.0, 2.0, 0.0))
    assert max(near) >= 7
    assert near[26] >= 7, "they stand there until it is over"
    assert math.dist(drive.simulator.body.place[:2], (4.0, 4.0)) < 1.0, "it could not leave"
    drive.simulator.halt()
    drive.until(75.0)
    place = drive.simulator.body.place
    bodies = drive.simulator.people.bodies
    assert (np.hypot(bodies[:, 0] - place[0], bodies[:, 1] - place[1]) > 1.6).all()
    assert drive_patiently(drive, Pose(12.0, 7.0, 0.0)) is ARRIVED


@pytest.mark.parametrize("seed", SEEDS)
def test_a_crowd_comes_after_a_robot_that_drives_on(seed: int) -> None:
    crowd = Conditions(crowds=(Crowd(2, stays_s=40.0, at_s=1.0),))
    drive = start(HALL, Pose(2.0, 4.0, 0.0), seed=seed, conditions=crowd)
    drive.until(9.0)
    go(drive, 1, Pose(8.0, 6.5, 0.0))
    followed = 0
    for _ in seconds(drive, 40):
        bodies, place = drive.simulator.people.bodies, drive.simulator.body.place
        followed += place[0] > 5.0 and bool((np.hypot(*(bodies[:, :2] - place[:2]).T) < 2.5).any())
    assert followed > 5


@pytest.mark.parametrize("seed", SEEDS)
def test_with_both_doors_shut_the_truth_is_the_door(seed: int) -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, doors=[SHUT_SOUTH, SHUT_NORTH])
    assert drive_leg(drive, 1, Pose(12.0, 2.0, 0.0), 180.0).end is NO_ROUTE
    assert Cause.DOOR in causes(drive)


@pytest.mark.parametrize("seed", SEEDS)
def test_people_shut_doors_behind_them_and_open_them_before_them(seed: int) -> None:
    conditions = Conditions(walkers=(Walkers(3, between=("west", "east")),), doors_shut_by_people=1.0)
    drive = start(TWO_ROOMS, Pose(2.0, 7.9, 0.0), seed=seed, conditions=conditions)
    world, people = drive.simulator.world, drive.simulator.people
    changes, crossings = 0, 0
    before, sides = world.shut, people.bodies[:, 0] > 7.0
    for tick in range(1, 4001):
        drive.until(tick / 10)
        changes += world.shut != before
        crossings += int((sides != (people.bodies[:, 0] > 7.0)).sum())
        before, sides = world.shut, people.bodies[:, 0] > 7.0
    assert crossings >= 5, "a shut door stops nobody who can open it"
    assert changes >= crossings / 2
    assert world.shut <= {"south door", "north door"}


@pytest.mark.parametrize("seed", SEEDS)
def test_the_robot_cannot_open_a_door_that_somebody_shut(seed: int) -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, doors=[SHUT_NORTH])
    body, world = drive.simulator.body, drive.simulator.world
    assert world.shut_door("south door", body.place.tolist(), body.outline, drive.simulator.people.bodies)
    assert drive_leg(drive, 1, Pose(12.0, 2.0, 0.0), 60.0).end is NO_ROUTE
    world.open_door("south door")
    assert drive_leg(drive, 2, Pose(12.0, 2.0, 0.0), 60.0).end is ARRIVED


@pytest.mark.parametrize("seed", SEEDS)
def test_those_who_walk_together_stay_together(seed: int) -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 7.9, 0.0), seed=seed, walkers=[Walkers(3, together=3)])
    people = drive.simulator.people
    apart, walking = [], 0
    for _ in seconds(drive, 240):
        if (np.hypot(*people.velocity.T) > 0.3).all():
            walking += 1
            apart.append(max(math.dist(a, b) for a in people.bodies[:, :2] for b in people.bodies[:, :2]))
    assert walking > 15
    assert np.median(apart) < 2.5
    assert np.quantile(apart, 0.9) < 4.0


@pytest.mark.parametrize("seed", SEEDS)
def test_at_quiet_hours_only_some_are_about_and_they_come_and_go_where_the_robot_does_not_see(seed: int) -> None:
    hour = 3600.0
    quiet = (AboutShare(18.0 * hour + 300.0, 18.0 * hour + 900.0, 0.25),)
    conditions = Conditions(walkers=(Walkers(8),), about=quiet)
    drive = start(TWO_ROOMS, Pose(2.0, 7.9, 0.0), seed=seed, conditions=conditions)
    counts = {}
    for second in seconds(drive, 1800):
        before = counts.get(second - 1, about(drive))
        counts[second] = about(drive)
        assert abs(counts[second] - before) <= 4
    assert counts[290] == 8
    assert min(counts[second] for second in range(600, 900)) <= 3
    assert min(counts[second] for second in range(600, 900)) >= 2
    assert counts[1800] >= 6


@pytest.mark.parametrize("seed", SEEDS)
def test_a_robot_that_stands_up_against_a_wall_is_told_so_by_the_truth(seed: int) -> None:
    drive = start(HALL, Pose(11.9 - 0.36, 4.0, 0.0), seed=seed)
    go(drive, 1, Pose(2.0, 4.0, 0.0))
    drive.until(10.0)
    assert drive.simulator.body.pose.x > 11.4, "it dares neither to turn nor to drive"
    assert Cause.WEDGED in causes(drive)
