"""A drive that can go sideways: what the robot makes of it."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from backends.contract import GoalStatus
from runner.site.values import Pose
from tests.backends.sim.support import CART, HALL, TWO_ROOMS, Drive, distance, go, start

SIDEWAYS = replace(CART, sideways_speed=0.4)


def headings(drive: Drive) -> list[float]:
    return [abs(math.remainder(report.pose.heading, 2.0 * math.pi)) for report in drive.telemetry()]


@pytest.mark.parametrize("seed", [1, 2, 3])
@pytest.mark.parametrize("aside", [0.8, -0.8])
def test_it_steps_aside_without_turning(aside: float, seed: int) -> None:
    drive = start(HALL, Pose(6.0, 4.0, 0.0), robot=SIDEWAYS, seed=seed)
    go(drive, 1, Pose(6.0, 4.0 + aside, 0.0))
    end = drive.until_end(20.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, Pose(6.0, 4.0 + aside, 0.0)) < 0.15
    assert max(headings(drive)) < math.radians(15.0)


def test_a_drive_that_cannot_go_sideways_turns_for_the_same_step() -> None:
    drive = start(HALL, Pose(6.0, 4.0, 0.0))
    go(drive, 1, Pose(6.0, 4.8, 0.0))
    end = drive.until_end(30.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert max(headings(drive)) > math.radians(60.0)
    assert drive.simulator.body.drive.side == 0.0


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_it_drives_through_a_door_to_a_far_goal_nose_first(seed: int) -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), robot=SIDEWAYS, seed=seed)
    goal = Pose(12.0, 7.0, math.pi)
    go(drive, 1, goal)
    end = drive.until_end(90.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, goal) < 0.15


def test_its_limits_are_kept() -> None:
    drive = start(HALL, Pose(6.0, 4.0, 0.0), robot=SIDEWAYS)
    go(drive, 1, Pose(6.0, 5.1, 0.0))
    fastest, before, steepest = 0.0, 0.0, 0.0
    while drive.simulator.clock.now() < 6.0:
        drive.until(drive.simulator.clock.now() + 0.1)
        side = drive.simulator.body.drive.side
        fastest, steepest, before = max(fastest, abs(side)), max(steepest, abs(side - before)), side
    assert 0.2 < fastest <= 0.4 + 1e-9
    assert steepest <= CART.acceleration * 0.1 + 1e-9
