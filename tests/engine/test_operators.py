"""Hold, release, skip and abort: legal in every state, and what they do in each."""

from __future__ import annotations

import pytest

from runner.engine.values import Ended, Go, Halt, LegEnded, OperatorActed, StepBegan
from runner.language.mission import Otherwise
from runner.machine.table import Ending, Event, Outcome
from tests.builders import FAR, SIDE, go, rule, wait
from tests.engine.driver import Driver, start


def driving() -> Driver:
    run = start(go(FAR, within=100.0), wait(50.0))
    run.see(5.0)
    return run


def recovering() -> Driver:
    run = driving()
    run.stand(13, 5.0)
    return run


def resting() -> Driver:
    run = start(go(FAR, rule(recover=()), within=100.0), wait(50.0))
    run.goal(Event.NO_ROUTE)
    return run


def waiting() -> Driver:
    run = driving()
    run.goal(Event.ARRIVED)
    return run


def held() -> Driver:
    run = driving()
    run.person(Event.HOLD)
    return run


EVERY_STATE = pytest.mark.parametrize("begin", [driving, recovering, resting, waiting, held])


@EVERY_STATE
def test_abort_halts_the_robot_and_ends_the_mission_in_every_state(begin: type[Driver]) -> None:
    run = begin()
    effects = run.person(Event.ABORT)
    assert run.state.ended is Ending.ABORTED
    assert any(isinstance(effect, Halt) for effect in effects)
    assert isinstance(effects[-1], Ended)


@EVERY_STATE
def test_skip_leads_on_to_the_next_step_in_every_state(begin: type[Driver]) -> None:
    run = begin()
    run.person(Event.SKIP)
    if begin is waiting:
        assert run.state.ended is Ending.COMPLETED
    else:
        assert run.all(StepBegan)[-1].text == "wait 50 s"
        assert run.all(LegEnded)[0].outcome is Outcome.SKIPPED


@EVERY_STATE
def test_hold_halts_and_release_goes_on_where_it_was(begin: type[Driver]) -> None:
    run = begin()
    run.person(Event.HOLD)
    assert run.at == "held"
    assert run.state.goal is None
    run.person(Event.RELEASE)
    expected = {driving: "drive", recovering: "drive", resting: "rest between tries", waiting: "wait", held: "drive"}
    assert run.at == expected[begin]


def test_releasing_a_drive_sends_a_new_goal_to_the_same_place() -> None:
    run = held()
    run.person(Event.RELEASE)
    assert [(command.goal_id, command.place) for command in run.all(Go)] == [(1, "far end"), (2, "far end")]


def test_time_limits_stand_still_while_held() -> None:
    run = held()
    run.pass_time(1000.0)
    assert run.at == "held"
    run.person(Event.RELEASE)
    run.pass_time(99.0)
    assert run.state.leg is not None
    run.pass_time(1.0)
    assert run.all(LegEnded)[0].reason == "its time limit was over"


def test_a_wait_goes_on_for_what_was_left_of_it() -> None:
    run = waiting()
    run.pass_time(20.0)
    run.person(Event.HOLD)
    run.pass_time(1000.0)
    run.person(Event.RELEASE)
    run.pass_time(29.0)
    assert run.state.ended is None
    run.pass_time(1.0)
    assert run.state.ended is Ending.COMPLETED


def test_release_means_nothing_unless_held_and_is_recorded_all_the_same() -> None:
    run = driving()
    run.person(Event.RELEASE)
    acted = run.all(OperatorActed)[0]
    assert (acted.action, acted.who, acted.accepted) == ("release", "nightwatch", False)
    assert run.at == "drive"


def test_the_end_by_time_comes_even_while_held() -> None:
    run = start(go(FAR), end_by=18 * 3600 + 60.0)
    run.person(Event.HOLD)
    run.pass_time(60.0)
    assert run.state.ended is Ending.TIMED_OUT


def test_nothing_has_any_effect_after_the_end() -> None:
    run = start(go(FAR, otherwise=Otherwise.SKIP), go(SIDE))
    run.person(Event.ABORT)
    before = run.state
    for event in (Event.HOLD, Event.RELEASE, Event.SKIP, Event.ABORT):
        assert run.person(event) == []
    assert run.state == before
