"""A robot that was carried knows that it is lost and finds itself; slip; relative moves; gaps. Each on three seeds."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from backends.contract import ActionReport, Goal, GoalStatus
from backends.sim.body import SOLID
from runner.site.values import Conditions, Fault, FaultKind, Odometry, Place, Pose, Site, Solid, Walkers, Wall
from tests.backends.sim.scenarios.watching import SEEDS, drive_leg
from tests.backends.sim.support import CART, HALL, Drive, box, distance, go, start

LOST_M = 1.0
"""A robot that knows its position no better than this is taken to be lost by whoever commands it."""

WARD = Site(
    "ward", 16.0, 9.0,
    (box(16.0, 9.0), Wall(((6.0, 0.0), (6.0, 5.5)), 0.1), Wall(((6.0, 5.5), (10.0, 5.5)), 0.1)),
    (Solid(((2.0, 6.5), (4.0, 6.5), (4.0, 7.5), (2.0, 7.5))),
     Solid(((12.0, 1.0), (13.0, 1.0), (13.0, 3.5), (12.0, 3.5)))),
    (), (Place("west", Pose(2, 2, 0)), Place("middle", Pose(8, 7.5, 0)), Place("east", Pose(14.5, 6, 0))),
)  # fmt: skip
"""Rooms of which no two are alike."""
GOAL = Pose(11.5, 7.6, 0.0)
"""Away from where people stand."""
WEST, ELSEWHERE = Pose(2.0, 2.0, 0.0), Pose(14.3, 5.0, 2.0)


def carried(seed: int) -> Drive:
    """A robot on its way that was put down elsewhere a moment ago, and has had 15 s to notice; people are about."""
    people = Conditions(walkers=(Walkers(2),))
    drive = start(WARD, WEST, seed=seed, conditions=people)
    go(drive, 1, GOAL)
    drive.until(3.0)
    drive.simulator.body.carry(ELSEWHERE)
    drive.until(18.0)
    return drive


@pytest.mark.parametrize("seed", SEEDS)
def test_a_carried_robot_soon_says_that_it_is_lost_and_stands(seed: int) -> None:
    drive = carried(seed)
    noticed = next(one.stamp for one in drive.telemetry() if one.spread > LOST_M)
    assert 3.0 <= noticed < 10.0
    there = drive.simulator.body.pose
    drive.until(25.0)
    assert distance(drive.simulator.body.pose, there) < 0.01
    assert drive.telemetry()[-1].spread > LOST_M, "it does not find itself by chance"


def relocated(drive: Drive, hint: Pose | None) -> ActionReport:
    drive.simulator.relocate(1, hint)
    answer = drive.until_answer(1, drive.simulator.clock.now() + 10.0)
    assert answer is not None
    return answer


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize("hint", [None, (0.4, -0.3, 0.2)], ids=["without a hint", "with a hint"])
def test_a_lost_robot_finds_itself_when_asked_to_and_drives_on(
    seed: int, hint: tuple[float, float, float] | None
) -> None:
    drive = carried(seed)
    true = drive.simulator.body.pose
    near = None if hint is None else Pose(true.x + hint[0], true.y + hint[1], true.heading + hint[2])
    assert relocated(drive, near).done
    found = drive.simulator.robot.pose
    assert distance(found, true) < 0.1
    assert abs(math.remainder(found.heading - true.heading, 2.0 * math.pi)) < math.radians(3.0)
    assert drive.simulator.localization.spread < 0.1
    end = drive.until_end(120.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, GOAL) < 0.2


@pytest.mark.parametrize("seed", SEEDS)
def test_a_wrong_hint_is_answered_with_a_reason_and_the_robot_stays_lost(seed: int) -> None:
    drive = carried(seed)
    answer = relocated(drive, Pose(2.0, 2.5, 1.0))
    assert not answer.done
    assert answer.reason in ("The map shows no spot like this one.", "Several spots on the map look alike from here.")
    assert drive.simulator.localization.spread > LOST_M


@pytest.mark.parametrize("seed", SEEDS)
def test_in_a_hall_that_looks_the_same_from_both_ends_the_robot_does_not_claim_to_know(seed: int) -> None:
    drive = start(HALL, Pose(3.0, 2.5, 0.3), seed=seed, robot=CART)
    answer = relocated(drive, None)
    true = drive.simulator.body.pose
    opposite = Pose(12.0 - true.x, 8.0 - true.y, true.heading + math.pi)
    believed = drive.simulator.robot.pose
    assert not answer.done or min(distance(believed, true), distance(believed, opposite)) < 0.3


# --- slip -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", SEEDS)
def test_where_wheels_slip_odometry_runs_ahead_and_the_map_pulls_the_belief_back(seed: int) -> None:
    slip = Fault(FaultKind.SLIP, 4.0, at_s=4.0, slip=0.5)
    drive = start(WARD, Pose(2.0, 5.8, 0.0), seed=seed, conditions=Conditions(faults=(slip,)))
    go(drive, 1, Pose(14.5, 6.3, 0.0))
    drive.until(4.0)
    wheels, body = drive.simulator.body.wheels, drive.simulator.body
    before, at = wheels.pose, body.pose
    drive.until(8.0)
    turned, made = distance(wheels.pose, before), distance(body.pose, at)
    assert made < 0.65 * turned
    drive.until(10.0)
    assert distance(drive.simulator.robot.pose, body.pose) < 0.15, "the burst is over and the map was looked at"
    end = drive.until_end(90.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(body.pose, Pose(14.5, 6.3, 0.0)) < 0.2


# --- relative moves ---------------------------------------------------------------------------------------------------


def relative_move(seed: int, odometry: Odometry) -> tuple[float, float]:
    """How far off 6 m ahead the robot really ended: ahead and to the left."""
    robot = replace(CART, odometry=odometry)
    drive = start(HALL, Pose(2.0, 4.0, 0.0), seed=seed, robot=robot)
    drive.simulator.go(Goal(1, Pose(6.0, 0.0, 0.0), 0.6, relative=True))
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    true = drive.simulator.body.pose
    return true.x - 8.0, true.y - 4.0


def test_a_relative_move_ends_off_by_what_the_wheels_do_not_know() -> None:
    """Sideways drift of a straight drive of N steps: variance about step^2 N^3 / 3 of the turn's variance in a step."""
    noise = Odometry(turn_by_way=0.06, last_turn_by_way=0.0)
    off = np.array([relative_move(seed, noise) for seed in range(1, 31)])
    steps, step = 100, 0.06
    drift = step * (noise.turn_by_way * step) * math.sqrt(steps**3 / 3.0)
    seen = float(np.sqrt(np.mean(off[:, 1] ** 2)))
    print(f"sideways after 6 m: {seen:.3f} m on 30 seeds, closed form {drift:.3f} m")
    assert 0.7 * drift < seen < 1.4 * drift


def test_a_relative_move_of_a_robot_whose_wheels_know_everything_ends_where_asked() -> None:
    exact = Odometry(0.0, 0.0, 0.0, 0.0, 0.0, 0.0)
    assert relative_move(1, exact) == pytest.approx((0.0, 0.0), abs=0.09)


# --- a gap ------------------------------------------------------------------------------------------------------------

GAP = Site(
    "gap", 12.0, 8.0,
    (box(12.0, 8.0), Wall(((6.0, 0.0), (6.0, 3.68)), 0.1), Wall(((6.0, 4.32), (6.0, 8.0)), 0.1)),
    (), (), (Place("west", Pose(2, 4, 0)), Place("east", Pose(10, 4, 0))),
)  # fmt: skip
"""A gap of 0.64 m."""
WIDE = ((0.2, 0.35), (-0.5, 0.35), (-0.5, -0.35), (0.2, -0.35))
"""0.7 m wide, and the largest disc about its turning center is 0.4 m wide."""


@pytest.mark.parametrize("seed", SEEDS)
def test_a_gap_that_the_disc_passes_and_the_outline_does_not_is_planned_through_and_not_driven(seed: int) -> None:
    robot = replace(CART, footprint=WIDE)
    drive = start(GAP, Pose(2.0, 4.0, 0.0), seed=seed, robot=robot)
    leg = drive_leg(drive, 1, Pose(10.0, 4.0, 0.0), 45.0)
    stuck = drive.simulator.body.pose
    drive.until(60.0)
    assert leg.end is None, "the planner keeps its route"
    assert any(math.dist(point, (6.0, 4.0)) < 0.3 for point in drive.telemetry()[-1].route)
    assert 4.5 < drive.simulator.body.pose.x < 6.0
    assert distance(drive.simulator.body.pose, stuck) < 0.1
    assert leg.standing > 10.0
    assert leg.contacts == 0
    assert drive.simulator.body.met != SOLID
