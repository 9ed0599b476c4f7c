"""The robot gets where it is sent, and says so as the contract has it."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import pytest

from backends.contract import ActionReport, Goal, GoalReport, GoalStatus, Telemetry
from runner.site.values import Battery, Pose
from tests.backends.sim.support import CART, HALL, TWO_ROOMS, distance, go, start

ARRIVED_M, ARRIVED_HEADING = 0.15, math.radians(8.0)


def heading_off(one: float, other: float) -> float:
    return abs(math.remainder(one - other, 2.0 * math.pi))


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_it_drives_through_a_door_and_stands_at_the_goal_with_its_heading(seed: int) -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed)
    goal = Pose(12.0, 7.0, math.pi)
    go(drive, 1, goal)
    end = drive.until_end(90.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    truth = drive.simulator.body.pose
    assert distance(truth, goal) < ARRIVED_M
    assert heading_off(truth.heading, goal.heading) < ARRIVED_HEADING
    assert drive.simulator.body.drive.still


def test_a_goal_is_accepted_then_under_way_then_arrived() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.until_end(60.0)
    assert drive.statuses() == [GoalStatus.ACCEPTED, GoalStatus.UNDER_WAY, GoalStatus.ARRIVED]


def test_the_remaining_route_falls_steadily_and_is_the_length_of_the_route_reported() -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0))
    go(drive, 1, Pose(12.0, 2.0, 0.0))
    drive.until_end(60.0)
    seen = [one for one in drive.telemetry() if one.remaining is not None]
    remaining = [one.remaining for one in seen if one.remaining is not None]
    assert remaining[0] > 10.0
    assert all(later <= earlier + 0.05 for earlier, later in pairwise(remaining))
    for one in seen:
        assert one.remaining is not None
        assert sum(map(math.dist, one.route, one.route[1:])) == pytest.approx(one.remaining, rel=0.03, abs=0.1)


def test_a_goal_may_cap_the_speed() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0), speed=0.3)
    drive.until_end(60.0)
    assert 0.25 < max(one.speed for one in drive.telemetry()) <= 0.3 + 1e-9


def test_speeds_change_no_faster_than_the_limits_allow() -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, math.pi))
    go(drive, 1, Pose(12.0, 7.0, 0.0))
    drive.until_end(90.0)
    seen = drive.telemetry()
    for earlier, later in pairwise(seen):
        passed = later.stamp - earlier.stamp + 1e-9
        assert abs(later.speed - earlier.speed) <= CART.acceleration * passed
        assert abs(later.turn_rate - earlier.turn_rate) <= CART.turn_acceleration * passed


def test_telemetry_comes_some_times_a_second_under_way_and_once_a_second_at_rest() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    end = drive.until_end(60.0)
    assert end is not None
    stamps = [one.stamp for one in drive.telemetry()]
    gaps = [later - earlier for earlier, later in pairwise(stamps)]
    assert max(gaps) <= 0.3 + 1e-9
    drive.until(end.stamp + 20.0)
    assert 18 <= sum(one.stamp > end.stamp + 0.5 for one in drive.telemetry()) <= 21


def test_the_same_goal_id_again_changes_nothing() -> None:
    once, twice = start(HALL, Pose(2.0, 4.0, 0.0)), start(HALL, Pose(2.0, 4.0, 0.0))
    for drive in (once, twice):
        go(drive, 1, Pose(10.0, 4.0, 0.0))
        drive.until(3.0)
    go(twice, 1, Pose(2.0, 2.0, 0.0))
    for drive in (once, twice):
        drive.until_end(60.0)
    go(twice, 1, Pose(10.0, 4.0, 0.0))
    for drive in (once, twice):
        drive.until(40.0)
    assert once.reports == twice.reports


def test_a_new_goal_replaces_the_one_under_way_for_which_nothing_more_comes() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.until(3.0)
    go(drive, 2, Pose(2.0, 2.0, 0.0))
    end = drive.until_end(60.0)
    assert end is not None
    assert (end.goal_id, end.status) == (2, GoalStatus.ARRIVED)
    ids = [(report.goal_id, report.status) for report in drive.reports if isinstance(report, GoalReport)]
    assert (1, GoalStatus.ARRIVED) not in ids
    assert (1, GoalStatus.HALTED) not in ids


def test_halt_stops_the_robot_within_its_limits_and_ends_the_goal() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.until(5.0)
    speed = drive.simulator.body.drive.speed
    drive.simulator.halt()
    end = drive.until_end(20.0)
    assert end is not None
    assert end.status is GoalStatus.HALTED
    assert end.stamp - 5.0 <= speed / CART.acceleration + 0.3
    stood = drive.simulator.body.pose
    drive.until(20.0)
    assert drive.simulator.body.pose == stood


def test_halt_with_nothing_to_do_is_legal_and_says_nothing() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    drive.simulator.halt()
    drive.until(3.0)
    assert all(isinstance(report, Telemetry) for report in drive.reports)


@pytest.mark.parametrize("pose", [Pose(7.0, 5.0, 0.0), Pose(3.0, 7.0, 0.0), Pose(-1.0, 2.0, 0.0), Pose(2.0, 50.0, 0.0)])
def test_a_goal_in_a_wall_or_off_the_floor_is_refused_with_a_sentence(pose: Pose) -> None:
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0))
    go(drive, 1, pose)
    end = drive.until_end(1.0)
    assert end is not None
    assert end.status is GoalStatus.REFUSED
    assert end.reason.startswith("The goal at ")
    assert drive.statuses() == [GoalStatus.REFUSED]


def test_a_robot_set_down_in_a_wall_cannot_be_made() -> None:
    with pytest.raises(ValueError, match="would stand in a wall"):
        start(TWO_ROOMS, Pose(7.0, 5.0, 0.0))


def test_easing_back_goes_straight_backward_by_the_distance_and_driving_goes_on_afterwards() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.until(6.0)
    drive.simulator.ease_back(7, 0.5)
    standing = drive.until(20.0, lambda one: isinstance(one, Telemetry) and one.speed <= 0.0)
    assert standing is not None
    before = drive.simulator.body.pose
    answer = drive.until_answer(7, 30.0)
    after = drive.simulator.body.pose
    assert answer is not None
    assert answer.done
    assert before.x - after.x == pytest.approx(0.5, abs=0.1)
    assert abs(before.y - after.y) < 0.1
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED


def test_easing_back_against_a_wall_says_that_there_is_no_room() -> None:
    drive = start(HALL, Pose(0.48, 4.0, 0.0))
    drive.simulator.ease_back(1, 0.5)
    answer = drive.until_answer(1, 20.0)
    assert answer is not None
    assert not answer.done
    assert answer.reason == "There is no room behind the robot."


def test_clear_replan_and_relocate_are_answered_with_and_without_a_goal() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    for first in (1, 11):
        drive.simulator.clear(first, 3.0)
        drive.simulator.replan(first + 1)
        drive.simulator.relocate(first + 2, Pose(2.0, 4.0, 0.0))
        drive.until(drive.simulator.clock.now() + 3.0)
        go(drive, first, Pose(10.0, 4.0, 0.0))
    answers = {report.action_id: report.done for report in drive.reports if isinstance(report, ActionReport)}
    assert answers == {1: True, 2: True, 3: True, 11: True, 12: True, 13: True}


def test_replanning_counts_the_route_up() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.until(2.0)
    drive.simulator.replan(1)
    drive.until(3.0)
    assert [drive.telemetry()[0].route_number, drive.telemetry()[-1].route_number] == [1, 2]


def test_an_empty_battery_ends_the_drive_and_charging_fills_it() -> None:
    tiny = replace(CART, battery=Battery(capacity=0.3, idle=20.0, driving=200.0, charging=2000.0))
    drive = start(HALL, Pose(2.0, 4.0, 0.0), robot=tiny)
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    end = drive.until_end(60.0)
    assert end is not None
    assert (end.status, end.reason) == (GoalStatus.FAILED, "The battery is empty.")
    drive.simulator.body.place[:] = (10.0, 4.0, 0.0)  # somebody pushes it to a charger
    drive.simulator.charge()
    drive.until(end.stamp + 5.0)
    assert drive.telemetry()[-1].battery == 1.0


def test_driving_off_ends_charging() -> None:
    tiny = replace(CART, battery=Battery(capacity=100.0, idle=2000.0, driving=2000.0, charging=2000.0))
    drive = start(HALL, Pose(2.0, 4.0, 0.0), robot=tiny)
    drive.until(10.0)
    drive.simulator.charge()
    drive.until(12.0)
    charged = drive.telemetry()[-1].battery
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.until_end(60.0)
    assert charged > drive.telemetry()[-1].battery


def test_a_new_route_asked_for_before_a_goal_that_is_refused_is_still_answered() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.simulator.replan(1)
    go(drive, 2, Pose(-5.0, 4.0, 0.0))
    answer = drive.until_answer(1, 1.0)
    assert answer is not None


def test_a_relative_goal_is_seen_from_where_the_robot_stands_and_driven_straight() -> None:
    drive = start(HALL, Pose(5.0, 2.0, math.pi / 2.0))
    drive.simulator.go(Goal(1, Pose(2.0, 0.5, math.pi / 2.0), 0.5, relative=True))
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    goal = Pose(4.5, 4.0, math.pi)
    assert distance(drive.simulator.body.pose, goal) < ARRIVED_M
    assert heading_off(drive.simulator.body.pose.heading, goal.heading) < ARRIVED_HEADING


def test_a_relative_goal_asks_for_no_way_round_what_stands_in_the_line() -> None:
    drive = start(TWO_ROOMS, Pose(4.5, 4.5, 0.0))
    drive.simulator.go(Goal(1, Pose(7.5, 0.0, 0.0), 0.5, relative=True))
    assert drive.until_end(30.0) is None
    before = drive.simulator.body.pose
    assert drive.until_end(40.0) is None
    assert distance(before, drive.simulator.body.pose) < 0.05
    assert 6.7 < drive.simulator.body.pose.x + 0.35 < 6.95
