"""Where the robot is and where it believes it is, on a shipped site and where the map cannot tell. Each on three seeds.

`test_where_am_i` has the same in small rooms made for it.
"""

from __future__ import annotations

import math
from dataclasses import replace
from datetime import datetime

import numpy as np
import pytest

from backends.contract import ActionReport, Goal, GoalReport, GoalStatus, Report, Setup, Telemetry
from backends.sim.simulator import Simulator
from runner.language.reader import load_robot, load_site
from runner.site.values import Conditions, DoorChange, Fault, FaultKind, Odometry, Pose, Walkers
from tests.backends.sim.scenarios.watching import SEEDS
from tests.backends.sim.support import CART, CORRIDOR, HALL, Drive, distance, go, start
from tests.bench.night import MISSIONS

LOST_M = 3.0
"""Spread over which a robot is certainly lost."""
CARRIED_S = 10.0
CLINIC = load_site(MISSIONS / "sites/harbour-clinic.yaml")
SMALL_CART = load_robot(MISSIONS / "robots/small-cart.yaml")
PLACES = {place.name: place.pose for place in CLINIC.places}


def in_the_clinic(seed: int, goal: str, *faults: Fault, people: int = 0) -> Drive:
    """The shipped robot leaves its charging bay for a place."""
    conditions = Conditions(faults=faults, walkers=(Walkers(people),) if people else ())
    at = PLACES["charging bay"]
    drive = Drive(Simulator(Setup(CLINIC, SMALL_CART, at, conditions, seed, datetime(2026, 1, 5, 14))))
    go(drive, 1, PLACES[goal])
    return drive


def error(drive: Drive) -> float:
    """How far off the robot believes to be, meters."""
    return distance(drive.simulator.robot.pose, drive.simulator.body.pose)


def arrives(drive: Drive, number: int, goal: str, within: float) -> None:
    """Send it to a place after a clear: it gets there in truth."""
    drive.simulator.clear(number, 8.0)
    go(drive, number, PLACES[goal])
    end = drive.until_end(drive.simulator.clock.now() + within)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, PLACES[goal]) < 0.2


def relocated(drive: Drive, hint: Pose | None) -> ActionReport:
    drive.simulator.relocate(90, hint)
    answer = drive.until_answer(90, drive.simulator.clock.now() + 20.0)
    assert answer is not None
    return answer


# --- carried --------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize("hinted", [True, False], ids=["with a hint", "without a hint"])
@pytest.mark.parametrize(("to", "goal"), [("laboratory", "ward west"), ("reception", "stores")])
def test_a_robot_carried_through_the_clinic_knows_that_it_is_lost_stands_and_finds_itself(
    seed: int, hinted: bool, to: str, goal: str
) -> None:
    carried = Fault(FaultKind.CARRIED, at_s=CARRIED_S, to=PLACES[to])
    drive = in_the_clinic(seed, "treatment room", carried)
    drive.until(CARRIED_S - 0.1)
    assert error(drive) < 0.15

    def is_lost(report: Report) -> bool:
        return isinstance(report, Telemetry) and report.spread > LOST_M

    assert drive.until(CARRIED_S + 10.0, is_lost) is not None, "within 10 s"
    stood = drive.simulator.body.pose
    drive.until(CARRIED_S + 30.0)
    assert distance(drive.simulator.body.pose, stood) < 0.35, "it comes to rest"
    stood = drive.simulator.body.pose
    drive.until(CARRIED_S + 60.0)
    assert drive.simulator.body.pose == stood
    assert drive.telemetry()[-1].spread > LOST_M
    assert not any(isinstance(one, GoalReport) and one.status is GoalStatus.ARRIVED for one in drive.reports)

    assert drive.simulator.memory.count == 0, "what it saw from the wrong place is taken back"
    answer = relocated(drive, Pose(stood.x + 0.3, stood.y - 0.4, stood.heading + 0.25) if hinted else None)
    assert (answer.done, answer.reason) == (True, "")
    assert error(drive) < 0.15
    drive.until(drive.simulator.clock.now() + 1.0)
    assert drive.telemetry()[-1].spread < 0.3
    arrives(drive, 100, goal, 180.0)


@pytest.mark.parametrize("seed", SEEDS)
def test_it_finds_itself_with_people_about(seed: int) -> None:
    carried = Fault(FaultKind.CARRIED, at_s=CARRIED_S, to=PLACES["laboratory"])
    drive = in_the_clinic(seed, "treatment room", carried, people=20)
    drive.until(CARRIED_S + 10.0)
    assert drive.telemetry()[-1].spread > LOST_M
    assert relocated(drive, None).done
    assert error(drive) < 0.15


@pytest.mark.parametrize("seed", SEEDS)
def test_a_lost_robot_does_not_drive_to_a_new_place_either_but_makes_a_relative_move(seed: int) -> None:
    carried = Fault(FaultKind.CARRIED, at_s=CARRIED_S, to=PLACES["laboratory"])
    drive = in_the_clinic(seed, "treatment room", carried)
    drive.until(CARRIED_S + 10.0)
    stood = drive.simulator.body.pose
    go(drive, 2, PLACES["kitchen"])
    drive.until(30.0)
    assert drive.simulator.body.pose == stood
    drive.simulator.go(Goal(3, Pose(0.5, 0.0, 0.0), 0.5, relative=True))
    end = drive.until_end(50.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, stood) == pytest.approx(0.5, abs=0.13)
    assert drive.telemetry()[-1].spread > LOST_M, "it still does not know where"


# --- where the map cannot tell ----------------------------------------------------------------------------------------


ALIKE = (Pose(3.0, 2.5, 0.3), Pose(2.0, 4.0, 0.0), Pose(5.0, 5.0, 1.0), Pose(9.0, 3.0, 2.0))
"""Each of them looks like another one on the other side of the hall, turned by half."""


@pytest.mark.parametrize("seed", SEEDS)
def test_in_a_hall_that_looks_the_same_turned_by_half_it_says_that_it_cannot_tell(seed: int) -> None:
    """Poses that stand for one of two spots may die out by chance while it looks: it claims to know in 1 of 5 tries."""
    claims = 0
    for at in ALIKE:
        drive = start(HALL, Pose(6.0, 6.0, -1.0), seed=seed)
        drive.until(2.0)
        drive.simulator.body.carry(at)
        drive.until(12.0)
        answer = relocated(drive, None)
        claims += answer.done
        if not answer.done:
            assert answer.reason == "Several spots on the map look alike from here."
            drive.until(drive.simulator.clock.now() + 1.5)
            assert drive.telemetry()[-1].spread > 1.0, "it says how little it knows"
        assert relocated(drive, Pose(at.x + 0.2, at.y - 0.2, at.heading + 0.1)).done, "a hint tells the two apart"
        assert error(drive) < 0.15
    assert claims <= 2


# --- doors that are shut ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", SEEDS)
def test_a_shut_door_in_a_corridor_is_not_taken_for_the_wall_farther_on(seed: int) -> None:
    """The map shows the kitchen's doorway open, at night it is shut: a robot that took the door for wall would believe
    to be most of a door's width farther on, and be a meter off for the rest of the corridor."""
    at = PLACES["charging bay"]
    shut = Conditions(doors=(DoorChange("kitchen door", 0.0, open=False),))
    drive = Drive(Simulator(Setup(CLINIC, SMALL_CART, at, shut, seed, datetime(2026, 1, 5, 14))))
    worst = 0.0
    for number in range(1, 25):
        go(drive, number, Pose(17.0 if number % 2 else 3.5, 12.4, 0.0 if number % 2 else math.pi))
        while drive.until_end(drive.simulator.clock.now() + 0.5) is None:
            worst = max(worst, error(drive))
    assert worst < 0.25


# --- slip, stuck, stopped ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", SEEDS)
def test_where_the_wheels_slip_odometry_runs_ahead_and_the_belief_stays_near_the_truth(seed: int) -> None:
    drive = in_the_clinic(seed, "laboratory", Fault(FaultKind.SLIP, 4.0, at_s=8.0, slip=0.2))
    drive.until(8.0)
    wheels, true = drive.simulator.body.wheels.pose, drive.simulator.body.pose
    worst = 0.0
    for tick in range(81, 121):
        drive.until(tick / 10.0)
        worst = max(worst, error(drive))
    counted, made = distance(drive.simulator.body.wheels.pose, wheels), distance(drive.simulator.body.pose, true)
    assert 0.7 * counted < made < 0.9 * counted
    for tick in range(121, 200):
        drive.until(tick / 10.0)
        worst = max(worst, error(drive))
    assert worst < 0.5 * (counted - made)
    end = drive.until_end(120.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, PLACES["laboratory"]) < 0.2


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize("kind", [FaultKind.WHEELS_STUCK, FaultKind.EMERGENCY_STOP])
def test_standing_for_want_of_wheels_leaves_the_belief_as_good_as_it_was(seed: int, kind: FaultKind) -> None:
    drive = in_the_clinic(seed, "laboratory", Fault(kind, 60.0, at_s=8.0))
    drive.until(9.0)
    stood = drive.simulator.body.pose
    for second in range(10, 68):
        drive.until(float(second))
        assert error(drive) < 0.06
        assert drive.telemetry()[-1].speed == 0.0
    assert drive.simulator.body.pose == stood
    assert not any(isinstance(one, GoalReport) and one.status is GoalStatus.ARRIVED for one in drive.reports)
    end = drive.until_end(180.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, PLACES["laboratory"]) < 0.2


# --- relative moves ---------------------------------------------------------------------------------------------------

AHEAD_M, SPEED = 8.0, 0.8


def moved_ahead(seed: int, odometry: Odometry, slip: float = 0.0, way: float = AHEAD_M) -> tuple[Drive, float, float]:
    """A drive to a spot so far ahead of where the robot stands; how far ahead and to the left of that it ends."""
    faults = (Fault(FaultKind.SLIP, 600.0, at_s=0.0, slip=slip),) if slip else ()
    drive = start(CORRIDOR if slip else HALL, Pose(2.0, 2.0 if slip else 4.0, 0.0), seed=seed,
                  robot=replace(CART, odometry=odometry), conditions=Conditions(faults=faults))  # fmt: skip
    begun = drive.simulator.body.pose
    drive.simulator.go(Goal(1, Pose(way, 0.0, 0.0), SPEED, relative=True))
    end = drive.until_end(90.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    true = drive.simulator.body.pose
    return drive, true.x - begun.x - way, true.y - begun.y


@pytest.mark.parametrize("seed", SEEDS)
def test_a_relative_move_ends_off_by_its_odometry_and_within_four_of_its_deviations(seed: int) -> None:
    """Steps of full speed: variance n a1^2 l^2 along, l^2 sum (k + 1/2)^2 var(turn) + l^2 sum k^2 var(last) across.

    The localization knows better all the while: it is within 10 cm of the truth where the robot says it has arrived.
    """
    noise = Odometry(way_by_way=0.1, turn_by_way=0.1, last_turn_by_way=0.02)
    drive, along, across = moved_ahead(seed, noise)
    step = SPEED * 0.1
    count = round(AHEAD_M / step)
    togo = np.arange(count)
    of_along = math.sqrt(count) * noise.way_by_way * step
    of_across = step * math.sqrt(float(np.sum((togo + 0.5) ** 2 * (noise.turn_by_way * step) ** 2
                                              + togo**2 * (noise.last_turn_by_way * step) ** 2)))  # fmt: skip
    near = 0.12  # how near counts as arrived
    assert abs(along) < 4.0 * of_along + near
    assert abs(across) < 4.0 * of_across + near
    assert math.hypot(along, across) > near, "the map did not pull it straight"
    assert error(drive) < 0.15


@pytest.mark.parametrize("seed", SEEDS)
def test_a_relative_move_on_slipping_wheels_ends_short_by_what_the_floor_does_not_give(seed: int) -> None:
    exact = Odometry(0.0, 0.0, 0.0, 0.0, 0.0, 0.0)
    drive, along, across = moved_ahead(seed, exact, slip=0.2, way=10.0)
    assert along == pytest.approx(-2.0, abs=0.15)
    assert abs(across) < 0.1
    assert drive.simulator.body.wheels.pose.x == pytest.approx(10.0, abs=0.12)
