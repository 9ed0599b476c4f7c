"""What both sides promise each other, tried in virtual time over good and bad lines."""

from __future__ import annotations

import pytest

from backends.contract import ActionReport, BackendError, GoalReport, GoalStatus
from backends.link.adapter import Robot
from backends.link.messages import Clear, EaseBack, Halt, Replan, encode
from tests.backends.link.rig import Badness, Rig, goal


def ready(rig: Rig, session: str = "session-one", peer: bytes = b"a") -> None:
    controller = rig.controller(session, peer)
    rig.run(1.5)
    assert controller.ready


def statuses(rig: Rig) -> list[GoalStatus]:
    return [report.status for report in rig.reports[b"a"] if isinstance(report, GoalReport)]


def test_a_goal_is_accepted_driven_and_arrived_at() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1))
    assert rig.run_until_ended(1).status is GoalStatus.ARRIVED
    assert statuses(rig)[-2:] == [GoalStatus.UNDER_WAY, GoalStatus.ARRIVED]
    assert rig.point.pose.x == pytest.approx(3.0)
    assert rig.telemetry()[-1].driven == pytest.approx(3.0, abs=0.2)


def test_stamps_never_fall_and_are_of_the_controllers_clock() -> None:
    rig = Rig()
    rig.run(100.0)
    rig.restart_robot()
    ready(rig)
    rig.controllers[b"a"].go(goal(1))
    ended = rig.run_until_ended(1)
    stamps = [report.stamp for report in rig.reports[b"a"]]
    assert stamps == sorted(stamps)
    assert ended.stamp == pytest.approx(rig.now, abs=0.1)


def test_the_same_goal_again_changes_nothing_even_after_it_ended() -> None:
    rig = Rig()
    ready(rig)
    controller = rig.controllers[b"a"]
    controller.go(goal(1))
    rig.run_until_ended(1)
    controller.go(goal(1))
    rig.run(3.0)
    assert len(rig.point.drives) == 1
    assert len(rig.goal_ends()) == 1


def test_a_new_goal_replaces_the_one_under_way_of_which_nothing_more_is_heard() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=9.0))
    rig.run(1.0)
    rig.controllers[b"a"].go(goal(2, x=1.0))
    rig.run_until_ended(2)
    assert [ended.goal_id for ended in rig.goal_ends()] == [2]


def test_a_halt_ends_the_goal_and_the_robot_stands() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=9.0))
    rig.run(1.0)
    rig.controllers[b"a"].halt()
    assert rig.run_until_ended(1, 1.0).status is GoalStatus.HALTED
    at = rig.point.pose
    rig.run(5.0)
    assert rig.point.pose == at


def test_a_goal_is_halted_though_the_controller_falls_silent_while_the_robot_brakes() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=9.0))
    rig.run(1.0)
    rig.to_robot.badness = Badness(drop=1.0)
    rig.run(0.9)
    rig.side.receive(b"a", "", encode(Halt(rig.controllers[b"a"]._lease.lease, 99)))  # type: ignore[union-attr]
    rig.run(3.0)
    assert not rig.side._duty.suspended
    assert rig.side._duty.ledger.current.goal is not None
    assert rig.side._duty.ledger.current.goal.status == "halted"


def test_a_goal_that_was_halted_before_it_was_sent_ends_and_is_never_driven() -> None:
    rig = Rig()
    ready(rig)
    controller = rig.controllers[b"a"]
    controller.go(goal(1))
    controller.halt()
    rig.run(3.0)
    assert [ended.status for ended in rig.goal_ends()] == [GoalStatus.HALTED]
    assert rig.point.drives == []


def test_a_goal_lost_on_the_way_before_a_halt_ends_as_halted() -> None:
    rig = Rig(Badness(cuts=((2.0, 2.5),)))
    ready(rig)
    rig.run(0.52)
    controller = rig.controllers[b"a"]
    controller.go(goal(1))
    rig.run(0.1)
    controller.halt()
    assert rig.run_until_ended(1, 3.0).status is GoalStatus.HALTED
    assert rig.point.drives == []


def test_actions_are_answered_once_and_in_order_over_a_line_that_loses_and_repeats() -> None:
    rig = Rig(Badness(drop=0.3, repeat=0.3, delay_spread=0.1), seed=5)
    rig.controller()
    rig.run(5.0)
    controller = rig.controllers[b"a"]
    controller.act(1, lambda lease, number, heard: Clear(lease, number, heard, 1, 3.0))
    controller.act(2, lambda lease, number, heard: Replan(lease, number, heard, 2))
    controller.act(3, lambda lease, number, heard: EaseBack(lease, number, heard, 3, 0.4))
    rig.run(20.0)
    assert [(answer.action_id, answer.done) for answer in rig.answers()] == [(1, True), (2, True), (3, True)]


def test_an_action_that_the_robot_is_not_able_to_do_is_answered_so() -> None:
    rig = Rig(robot=Robot("plain", frozenset(), 1.0))
    ready(rig)
    rig.controllers[b"a"].act(1, lambda lease, number, heard: Replan(lease, number, heard, 1))
    rig.run(1.0)
    assert rig.answers() == [ActionReport(rig.answers()[0].stamp, 1, False, "This robot has no ability called replan.")]


def test_a_command_that_no_robot_could_read_is_refused_here() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1, speed=-1.0))
    rig.run(0.1)
    assert [ended.status for ended in rig.goal_ends()] == [GoalStatus.REFUSED]


def test_the_robot_stops_by_itself_when_its_controller_is_silent() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=20.0))
    rig.run(2.0)
    del rig.controllers[b"a"]
    rig.run(1.3)
    at = rig.point.pose
    rig.run(5.0)
    assert rig.point.pose == at


def test_beats_that_are_stuck_in_the_line_do_not_keep_the_robot_going() -> None:
    rig = Rig(Badness(cuts=((4.0, 12.0),), held=True))
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=20.0))
    rig.run(6.5)
    rig.to_robot.badness = Badness(delay=1.5)
    rig.to_controllers.badness = Badness(delay=1.5)
    at = rig.point.pose
    rig.run(10.0)
    assert rig.point.pose == at


@pytest.mark.parametrize("held", [False, True])
def test_after_a_cut_the_same_goal_is_driven_on_and_reported_once(held: bool) -> None:
    rig = Rig(Badness(cuts=((3.0, 8.0), (9.0, 14.0)), held=held))
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=3.0))
    assert rig.run_until_ended(1).status is GoalStatus.ARRIVED
    assert len(rig.goal_ends()) == 1
    assert len(rig.point.drives) == 3
    assert rig.side.counts.suspended == 2


def test_a_lease_of_a_controller_that_stays_away_ends_and_its_goal_with_it() -> None:
    rig = Rig(Badness(cuts=((3.0, 40.0),)))
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=30.0))
    rig.run(35.0)
    assert not rig.side.leased
    assert rig.run_until_ended(1).status is GoalStatus.HALTED


def test_a_second_controller_gets_nothing_while_the_first_is_there_and_the_lease_when_it_left() -> None:
    rig = Rig()
    ready(rig)
    other = rig.controller("session-two", b"b")
    rig.run(4.0)
    assert not other.ready
    assert rig.side.counts.lease_refused > 3
    rig.controllers[b"a"].leave()
    rig.run(0.2)
    del rig.controllers[b"a"]
    rig.run(1.0)
    assert other.ready


def test_a_controller_gives_up_on_a_robot_that_another_keeps() -> None:
    rig = Rig()
    ready(rig)
    rig.controller("session-two", b"b")
    with pytest.raises(BackendError, match="Another controller has taken the robot"):
        rig.run(15.0)


def test_two_programs_of_one_session_do_not_take_the_robot_from_each_other_for_ever() -> None:
    rig = Rig()
    ready(rig)
    rig.controller("session-one", b"b")
    with pytest.raises(BackendError, match="Another program drives the robot for this same run"):
        rig.run(30.0)


def test_a_controller_that_was_started_again_takes_its_lease_over_and_goes_on_with_its_goal() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(7, x=3.0))
    rig.run(2.0)
    again = rig.controller("session-one", b"a2")
    del rig.controllers[b"a"]
    rig.run(1.0)
    again.go(goal(7, x=3.0))
    assert rig.run_until_ended(7, peer=b"a2").status is GoalStatus.ARRIVED
    assert rig.point.driven == pytest.approx(3.0)


def test_a_robot_that_was_started_again_drives_the_same_goal_on_if_it_kept_it() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=3.0))
    rig.run(2.0)
    rig.restart_robot(rig.side.worth_keeping())
    assert rig.run_until_ended(1).status is GoalStatus.ARRIVED
    assert rig.point.pose.x == pytest.approx(3.0)
    assert len(rig.goal_ends()) == 1


@pytest.mark.parametrize("x", [0.2, 3.0])
def test_a_goal_that_a_robot_forgot_when_it_was_started_again_has_failed_and_is_not_driven_again(x: float) -> None:
    """Nobody knows any more whether it had ended: the nearer one had, and the word of it was lost."""
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=x))
    rig.to_controllers.badness = Badness(drop=1.0)
    rig.run(0.7)
    rig.restart_robot()
    rig.to_controllers.badness = Badness()
    end = rig.run_until_ended(1)
    assert (end.status, end.reason) == (
        GoalStatus.FAILED,
        "The robot's program was started again and does not know its goal any more.",
    )
    rig.run(3.0)
    assert len(rig.point.drives) == 1
    rig.controllers[b"a"].go(goal(2, x=x + 0.1))
    assert rig.run_until_ended(2).status is GoalStatus.ARRIVED


def test_a_goal_that_had_ended_before_a_restart_is_not_driven_again() -> None:
    rig = Rig()
    ready(rig)
    controller = rig.controllers[b"a"]
    controller.go(goal(1, x=0.2))
    rig.to_controllers.badness = Badness(drop=1.0)
    rig.run(3.0)
    rig.restart_robot(rig.side.worth_keeping())
    rig.to_controllers.badness = Badness()
    assert rig.run_until_ended(1).status is GoalStatus.ARRIVED
    assert len(rig.point.drives) == 1


def test_an_action_under_way_when_the_robot_was_started_again_is_answered() -> None:
    rig = Rig()
    ready(rig)
    rig.controllers[b"a"].act(1, lambda lease, number, heard: Clear(lease, number, heard, 1, 3.0))
    rig.run(0.1)
    rig.restart_robot()
    rig.run(3.0)
    assert [(answer.done, answer.reason) for answer in rig.answers()] == [
        (False, "The robot's program was started again.")
    ]


def test_a_relative_move_that_was_broken_off_goes_on_by_what_is_left_of_it() -> None:
    rig = Rig(Badness(cuts=((3.0, 8.0),)))
    ready(rig)
    rig.controllers[b"a"].go(goal(1, x=3.0, relative=True))
    assert rig.run_until_ended(1).status is GoalStatus.ARRIVED
    assert [drive.relative for drive in rig.point.drives] == [True, True]
    assert rig.point.pose.x == pytest.approx(3.0, abs=0.05)


def test_telemetry_is_held_back_while_nobody_says_that_it_comes_and_never_comes_late() -> None:
    rig = Rig(Badness(cuts=((3.0, 13.0),), held=True))
    ready(rig)
    rig.run(10.0)
    assert rig.side.counts.telemetry_held_back > 10
    rig.run(4.0)
    ages = [abs(rig.now - report.stamp) for report in rig.telemetry()[-3:]]
    assert max(ages) < 1.0


def test_a_late_goal_is_refused_until_the_line_is_quick_enough() -> None:
    rig = Rig()
    ready(rig)
    rig.to_robot.badness = Badness(delay=1.4)
    rig.controllers[b"a"].go(goal(1))
    rig.run(5.0)
    assert rig.point.drives == []
    assert rig.side.counts.late > 0
    rig.to_robot.badness = Badness()
    assert rig.run_until_ended(1).status is GoalStatus.ARRIVED
