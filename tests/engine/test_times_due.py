"""What is told about times that go on after an interruption, or that came due while nobody looked."""

from __future__ import annotations

from runner.engine.values import Asked, ClockMoved, Halt, LegEnded, Tick
from runner.language.mission import Ask
from runner.machine.table import Event
from tests.builders import go, mark, repeat, wait
from tests.engine.driver import start


def test_a_mission_that_ends_because_the_clock_was_set_past_its_end_ends_now_and_not_in_the_past() -> None:
    run = start(go(), end_by=18.5 * 3600.0)
    run.give(ClockMoved(5.0, 3600.0))
    run.give(Tick(8.0))
    assert [note.seconds for note in run.all(LegEnded)] == [5.0]


def test_a_question_that_is_asked_again_says_how_much_time_is_left() -> None:
    run = start(Ask(mark(), "Tray taken?", ("yes", "no"), 90.0, "no"))
    run.pass_time(30.0)
    run.person(Event.HOLD)
    run.pass_time(100.0)
    run.person(Event.RELEASE)
    assert [note.seconds for note in run.all(Asked)] == [90.0, 60.0]


def test_skipping_the_pause_of_a_loop_halts_the_robot_as_every_skip_does() -> None:
    run = start(repeat(wait(1.0), times=2, every=60.0))
    run.pass_time(10.0)
    assert Halt() in run.person(Event.SKIP)
