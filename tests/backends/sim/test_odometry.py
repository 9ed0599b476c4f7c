"""What the wheels feel and what they do not."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from backends.contract import Goal, GoalStatus
from backends.sim.odometry import Doubt, Wheels
from runner.site.values import Bystander, Carton, Conditions, Fault, FaultKind, Odometry, Pose
from tests.backends.sim.support import CART, HALL, Drive, distance, go, start

EXACT = Odometry(0.0, 0.0, 0.0, 0.0, 0.0, 0.0)
WEST, EAST = Pose(2.0, 4.0, 0.0), Pose(10.0, 4.0, 0.0)


def exact(conditions: Conditions | None = None) -> Drive:
    """A robot on its way from west to east whose wheels count without error."""
    robot = replace(CART, odometry=EXACT)
    drive = (
        start(HALL, WEST, robot=robot) if conditions is None else start(HALL, WEST, robot=robot, conditions=conditions)
    )
    go(drive, 1, EAST)
    return drive


def with_fault(kind: FaultKind, slip: float = 0.0) -> Drive:
    return exact(Conditions(faults=(Fault(kind, 4.0, at_s=4.0, slip=slip),)))


def test_wheels_that_count_without_error_say_where_the_robot_is_as_seen_from_its_start() -> None:
    drive = exact()
    drive.until_end(60.0)
    true, wheels = drive.simulator.body.pose, drive.simulator.body.wheels.pose
    assert (wheels.x, wheels.y, wheels.heading) == pytest.approx((true.x - 2.0, true.y - 4.0, true.heading), abs=1e-9)


def test_being_carried_is_not_felt() -> None:
    drive = exact()
    drive.until(4.0)
    before = drive.simulator.body.wheels.pose
    drive.simulator.body.carry(Pose(5.0, 2.0, 1.0))
    assert drive.simulator.body.wheels.pose == before
    drive.until(12.0)
    assert distance(drive.simulator.body.wheels.pose, before) < 1.0, "it noticed that it is lost, and stands"


@pytest.mark.parametrize("kind", [FaultKind.WHEELS_STUCK, FaultKind.EMERGENCY_STOP])
def test_wheels_that_do_not_turn_add_nothing_however_much_is_asked_of_them(kind: FaultKind) -> None:
    drive = with_fault(kind)
    drive.until(4.2)
    before, driven = drive.simulator.body.wheels.pose, drive.simulator.body.driven
    drive.until(7.9)
    assert (drive.simulator.body.wheels.pose, drive.simulator.body.driven) == (before, driven)
    drive.until(12.0)
    assert distance(drive.simulator.body.wheels.pose, before) > 1.0
    assert drive.simulator.body.driven > driven + 1.0


def test_wheels_that_slip_count_the_whole_way() -> None:
    drive = with_fault(FaultKind.SLIP, slip=0.25)
    drive.until(4.0)
    wheels, true = drive.simulator.body.wheels.pose, drive.simulator.body.pose
    drive.until(6.0)
    counted, made = distance(drive.simulator.body.wheels.pose, wheels), distance(drive.simulator.body.pose, true)
    assert made == pytest.approx(0.75 * counted, rel=1e-3)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_a_robot_that_runs_into_something_unseen_counts_only_the_part_that_it_made(seed: int) -> None:
    low = Carton((6.0, 4.0), (0.4, 0.4), low=True)
    drive = start(HALL, WEST, seed=seed, robot=replace(CART, odometry=EXACT), cartons=[low])
    go(drive, 1, EAST)
    drive.until(30.0)
    true, wheels = drive.simulator.body.pose, drive.simulator.body.wheels.pose
    assert true.x == pytest.approx(5.8 - 0.35, abs=0.02)
    assert wheels.x == pytest.approx(true.x - 2.0, abs=0.02)
    assert drive.simulator.body.driven == pytest.approx(true.x - 2.0, abs=0.02)


def test_a_robot_at_rest_counts_nothing() -> None:
    drive = start(HALL, WEST, conditions=Conditions(bystanders=(Bystander((5.0, 4.0)),)))
    drive.until(30.0)
    assert drive.simulator.body.wheels.pose == Pose(0.0, 0.0, 0.0)
    assert drive.simulator.body.wheels.ask() == Doubt()


def test_doubt_grows_by_variances_until_somebody_asks_and_then_begins_anew() -> None:
    noise = Odometry(0.05, 0.0, 0.02, 0.0, 0.005, 0.0)
    wheels = Wheels(noise, np.random.default_rng(1))
    for _ in range(10):
        wheels.advance(0.6, 0.0, 0.0, 0.1)
    doubt = wheels.ask()
    assert (doubt.way, doubt.turn, doubt.last) == pytest.approx((10 * 0.003**2, 10 * 0.0012**2, 10 * 0.0003**2))
    wheels.advance(0.0, 0.0, 0.0, 0.1)
    assert wheels.ask() == Doubt()


def test_the_same_seed_gives_the_same_odometry_and_another_another() -> None:
    ends = []
    for seed in (1, 1, 2):
        drive = start(HALL, WEST, seed=seed)
        go(drive, 1, Pose(8.0, 6.0, math.pi))
        drive.until(20.0)
        ends.append(drive.simulator.body.wheels.pose)
    assert ends[0] == ends[1] != ends[2]


def test_a_relative_goal_of_a_robot_that_turned_is_seen_from_how_it_stands_now() -> None:
    drive = start(HALL, Pose(6.0, 2.0, 0.0), robot=replace(CART, odometry=EXACT))
    go(drive, 1, Pose(6.0, 2.05, math.pi / 2.0))
    assert drive.until_end(30.0) is not None
    drive.simulator.go(Goal(2, Pose(3.0, 0.0, 0.0), 0.5, relative=True))
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, Pose(6.0, 5.0, 0.0)) < 0.3
