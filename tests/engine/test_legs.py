"""What the engine does with one leg: arrival, the ladder of recoveries, its three bounds, and what comes after."""

from __future__ import annotations

import pytest

from runner.engine.values import (
    Clear,
    EaseBack,
    Ended,
    Go,
    GoalNews,
    Halt,
    IncidentBegan,
    IncidentEnded,
    LegEnded,
    RecoveryBegan,
    Replan,
    StepBegan,
    TryFailed,
)
from runner.language.mission import Otherwise, Recovery, RecoveryKind, Rest
from runner.machine.table import Ending, Event, Outcome
from tests.builders import FAR, HOME, SIDE, go, repeat, rule, visit, wait
from tests.engine.driver import Driver, start

CARTON = ((1.8, 1.0), (1.8, 1.1))


def test_a_goal_is_sent_and_its_arrival_ends_the_leg_and_the_mission() -> None:
    run = start(go(FAR))
    assert run.all(Go)[0].place == "far end"
    run.see(5.0)
    run.goal(Event.ARRIVED)
    assert [(leg.outcome, leg.tries, leg.recoveries) for leg in run.all(LegEnded)] == [(Outcome.ARRIVED, 1, 0)]
    assert run.all(Ended)[0].ending is Ending.COMPLETED


def test_goal_ids_never_repeat() -> None:
    run = start(visit([FAR, SIDE, HOME]))
    for _ in range(3):
        run.goal(Event.ARRIVED)
    assert [command.goal_id for command in run.all(Go)] == [1, 2, 3]


def test_news_of_an_earlier_goal_changes_nothing() -> None:
    run = start(visit([FAR, SIDE]))
    run.goal(Event.ARRIVED)
    before = run.state
    assert run.give(GoalNews(run.now, 1, Event.FAILED, "late")) == []
    assert run.state == before


def test_a_stall_starts_the_first_recovery_with_the_goal_still_under_way() -> None:
    run = start(go(FAR))
    run.stand(13, 5.0)
    assert run.all(IncidentBegan)[0].sign is Event.STALLED
    assert run.at == "replan"
    assert len(run.all(Replan)) == 1
    assert len(run.all(Go)) == 1
    assert run.all(Halt) == []


def test_recoveries_come_in_the_order_written_and_then_the_try_is_over() -> None:
    run = start(go(FAR))
    climb(run)
    names = [note.recovery for note in run.all(RecoveryBegan)]
    assert names == ["replan", "clear 3 m", "ease back 0.4 m", "rest 30 s"]
    assert run.at == "rest between tries"
    assert run.all(TryFailed)[0].rest == 20.0


def test_progress_ends_the_incident_and_names_the_recovery_that_helped() -> None:
    run = start(go(FAR))
    run.stand(13, 5.0, CARTON)
    run.action()
    run.stand(13, 5.0, CARTON)
    assert run.all(Clear)[0].radius == 3.0
    run.action()
    run.see(4.9)
    run.see(4.6)
    ended = run.all(IncidentEnded)[0]
    assert (ended.recovered, ended.ended_by) == (True, "clear 3 m")
    assert ended.diagnosis == "remembered obstacle that was gone"


def test_progress_restores_the_first_recovery_but_never_the_total_bound() -> None:
    run = start(go(FAR, rule(tries=2)))
    remaining = 100.0
    for _ in range(8):
        run.stand(13, remaining)
        assert run.at == "replan"
        run.action()
        run.see(remaining)
        remaining -= 1.0
        run.see(remaining)
    run.stand(13, remaining)
    leg = run.all(LegEnded)[0]
    assert (leg.outcome, leg.recoveries, leg.reason) == (Outcome.FAILED, 8, "all 8 recoveries used")


def test_a_leg_fails_after_exactly_the_tries_of_its_rule() -> None:
    run = start(go(FAR, rule(tries=3), otherwise=Otherwise.SKIP))
    for _ in range(3):
        climb(run)
        run.pass_time(200.0)
    leg = run.all(LegEnded)[0]
    assert (leg.outcome, leg.tries, leg.recoveries) == (Outcome.FAILED, 3, 12)
    assert leg.reason == "all 3 tries failed"
    assert [note.rest for note in run.all(TryFailed)] == [20.0, 40.0]


def test_the_rest_between_tries_doubles_up_to_its_most() -> None:
    impatient = rule(tries=6, recover=(), rest=Rest(20.0, 2.0, 100.0))
    run = start(go(FAR, impatient))
    for _ in range(5):
        run.goal(Event.NO_ROUTE)
        run.pass_time(100.0)
    assert [note.rest for note in run.all(TryFailed)] == [20.0, 40.0, 80.0, 100.0, 100.0]


def test_no_route_goes_up_the_ladder_at_once_and_a_new_goal_is_sent_after_the_recovery() -> None:
    run = start(go(FAR))
    run.goal(Event.NO_ROUTE, "the way is blocked")
    assert run.all(IncidentBegan)[0].detail == "the way is blocked"
    run.action()
    assert [command.goal_id for command in run.all(Go)] == [1, 2]


def test_a_recovery_that_the_robot_cannot_do_leads_to_the_next_one() -> None:
    run = start(go(FAR))
    run.goal(Event.NO_ROUTE)
    run.action(done=False)
    assert run.at == "clear 3 m"


def test_a_recovery_that_takes_too_long_is_halted_and_the_next_one_begins() -> None:
    run = start(go(FAR))
    run.stand(13, 5.0)
    run.pass_time(61.0)
    assert run.all(Halt)
    assert run.at == "clear 3 m"


def test_arriving_during_a_recovery_is_arriving() -> None:
    run = start(go(FAR))
    run.stand(13, 5.0)
    run.goal(Event.ARRIVED)
    assert run.all(LegEnded)[0].outcome is Outcome.ARRIVED
    assert run.all(IncidentEnded)[0].ended_by == "replan"


def test_the_time_limit_of_a_step_ends_the_leg_in_any_state() -> None:
    run = start(go(FAR, within=60.0, otherwise=Otherwise.SKIP))
    run.goal(Event.NO_ROUTE)
    run.pass_time(60.0)
    assert run.all(LegEnded)[0].reason == "its time limit was over"


def test_the_rule_gives_up_in_time() -> None:
    run = start(go(FAR, rule(give_up_after=100.0), otherwise=Otherwise.SKIP))
    run.pass_time(100.0)
    assert run.all(LegEnded)[0].reason == "the rule gave up"


@pytest.mark.parametrize(
    ("otherwise", "ending", "steps"),
    [
        (None, Ending.LEG_FAILED, ["go to far end"]),
        (Otherwise.END, Ending.LEG_FAILED, ["go to far end"]),
        (Otherwise.SKIP, Ending.COMPLETED, ["go to far end", "wait 5 s"]),
        ((wait(2.0),), Ending.COMPLETED, ["go to far end", "wait 2 s", "wait 5 s"]),
    ],
)
def test_what_follows_a_failed_leg_is_what_the_author_wrote(
    otherwise: Otherwise | tuple[()] | None, ending: Ending, steps: list[str]
) -> None:
    run = start(go(FAR, rule(tries=1, recover=()), otherwise=otherwise), wait(5.0))
    run.goal(Event.REFUSED)
    run.pass_time(10.0)
    assert [note.text for note in run.all(StepBegan)] == steps
    assert run.all(Ended)[0].ending is ending


def test_a_rest_halts_the_robot_and_sends_the_goal_anew_afterwards() -> None:
    run = start(go(FAR, rule(recover=(Recovery(RecoveryKind.REST, 30.0),))))
    run.stand(13, 5.0)
    assert len(run.all(Halt)) == 1
    run.pass_time(28.0)
    assert len(run.all(Go)) == 1
    run.pass_time(2.0)
    assert len(run.all(Go)) == 2


def test_easing_back_asks_for_the_distance_written() -> None:
    run = start(go(FAR, rule(recover=(Recovery(RecoveryKind.EASE_BACK, 0.4),))))
    run.stand(13, 5.0)
    assert run.all(EaseBack)[0].distance == 0.4


def test_laps_are_counted_and_a_loop_of_times_ends() -> None:
    run = start(repeat(wait(5.0), times=3))
    run.pass_time(20.0)
    assert [note.laps for note in run.all(StepBegan)] == [(), (1,), (2,), (3,)]
    assert run.state.ended is Ending.COMPLETED


def test_a_loop_until_a_clock_time_ends_its_last_lap_and_no_more() -> None:
    run = start(repeat(wait(600.0), until_clock=18 * 3600 + 1500.0))
    run.pass_time(3600.0)
    assert [note.laps for note in run.all(StepBegan)][1:] == [(1,), (2,), (3,)]


def test_a_clock_time_that_has_passed_means_tomorrow() -> None:
    run = start(repeat(wait(3600.0), until_clock=5.5 * 3600))
    run.pass_time(11 * 3600.0)
    assert run.state.ended is None
    run.pass_time(3600.0)
    assert run.state.ended is Ending.COMPLETED


def test_the_end_by_time_halts_the_robot_and_ends_the_mission_wherever_it_is() -> None:
    run = start(repeat(go(FAR), times=100), end_by=18 * 3600 + 90.0)
    run.pass_time(100.0)
    assert run.state.ended is Ending.TIMED_OUT
    assert isinstance(run.effects[-3], Halt)
    assert run.all(LegEnded)[0].outcome is Outcome.ABORTED


def climb(run: Driver) -> None:
    """Stall through the whole ladder of a try."""
    for _ in range(3):
        run.stand(13, 5.0)
        run.action()
    run.stand(13, 5.0)
    run.pass_time(30.0)
    run.stand(13, 5.0)
