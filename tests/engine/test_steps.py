"""The steps that are not legs: waits for conditions, questions, intervals, visits by order, counts and ends."""

from __future__ import annotations

from dataclasses import replace

import pytest

from runner.engine.values import (
    Answer,
    Answered,
    Asked,
    Begin,
    ClockMoved,
    Counted,
    Ended,
    Go,
    LegEnded,
    Notified,
    OperatorActed,
    StepBegan,
)
from runner.language.expressions import Expression, Kind, Quantity
from runner.language.mission import Ask, Count, End, Notify, Order, Otherwise, Overrun, Prove, Run, Step, Wait, When
from runner.machine.compiler import compile_mission
from runner.machine.table import Ending, Event
from tests.builders import FAR, HOME, SIDE, compare, condition, go, mark, mission, repeat, rule, visit, wait
from tests.engine.driver import Driver, start

QUESTION = Ask(mark(), "Tray taken?", ("yes", "no"), 90.0, "no")


def until(quantity: Quantity, operator: str, value: float, lasting: float = 0.0) -> Wait:
    return Wait(mark(), None, condition(compare(quantity, operator, value), lasting), 300.0)


def told(run: Driver) -> list[str]:
    return [note.text for note in run.all(Notified)]


def say(text: str) -> Notify:
    return Notify(mark(), text)


def test_a_wait_for_a_clock_time_ends_then() -> None:
    run = start(replace(until(Quantity.CLOCK, ">=", 19 * 3600.0), up_to=None))
    run.pass_time(3599.0)
    assert run.state.ended is None
    run.pass_time(1.1)
    assert run.state.ended is Ending.COMPLETED


def test_a_wait_in_vain_goes_on_or_takes_its_otherwise() -> None:
    in_vain = until(Quantity.BATTERY, "<", 0.1)
    run = start(in_vain, replace(in_vain, otherwise=(say("still full"),)), say("on"))
    run.pass_time(600.0)
    assert told(run) == ["still full", "on"]


def test_a_condition_that_holds_already_still_takes_a_second() -> None:
    run = start(until(Quantity.ELAPSED, ">=", 0.0))
    run.pass_time(0.9)
    assert run.state.ended is None
    run.pass_time(0.1)
    assert run.state.ended is Ending.COMPLETED


def test_a_condition_must_hold_for_its_time_without_a_break() -> None:
    run = start(until(Quantity.BATTERY, ">", 0.5, lasting=10.0))
    run.see(None, after=2.0)
    run.pass_time(9.0)
    assert run.state.ended is None
    run.pass_time(1.0)
    assert run.state.ended is Ending.COMPLETED


def test_daylight_saving_moves_a_wait_for_the_clock_and_no_other() -> None:
    run = start(replace(until(Quantity.CLOCK, ">=", 20 * 3600.0), up_to=None), wait(600.0))
    run.pass_time(3600.0)
    run.give(ClockMoved(run.now, -3600.0))
    run.pass_time(3700.0)
    assert run.at == "wait until"
    run.pass_time(3500.1)
    assert run.at == "wait"
    run.give(ClockMoved(run.now, 3600.0))
    run.pass_time(599.0)
    assert run.state.ended is None
    run.pass_time(1.0)
    assert run.state.ended is Ending.COMPLETED


def test_a_question_takes_one_of_its_answers_and_no_other() -> None:
    yes = condition(Expression(Kind.ANSWER, word="yes"))
    run = start(QUESTION, When(mark(), yes, (say("taken"),), (say("left"),)))
    assert run.all(Asked)[0].answers == ("yes", "no")
    run.give(Answer(1.0, "perhaps", "nurse"))
    assert run.all(OperatorActed)[0].accepted is False
    run.give(Answer(2.0, "Yes", "nurse"))
    assert run.all(Answered) == [Answered("yes", "nurse")]
    assert told(run) == ["taken"]


def test_silence_is_answered_as_written() -> None:
    run = start(QUESTION)
    run.pass_time(90.0)
    assert run.all(Answered) == [Answered("no", "")]
    assert run.state.ended is Ending.COMPLETED


def test_an_answer_to_no_question_is_refused() -> None:
    run = start(wait(10.0))
    run.give(Answer(1.0, "yes", "nurse"))
    assert [(note.action, note.accepted) for note in run.all(OperatorActed)] == [("answer yes", False)]


def test_when_takes_one_way_or_the_other() -> None:
    late = condition(compare(Quantity.ELAPSED, ">=", 5.0))
    run = start(
        When(mark(), late, (say("late"),), ()), wait(10.0), When(mark(), late, (say("later"),), (say("early"),))
    )
    run.pass_time(10.0)
    assert told(run) == ["later"]


def test_counts_add_up_and_end_a_loop() -> None:
    enough = condition(compare(Quantity.COUNT, ">=", 5.0, "trays"))
    run = start(repeat(wait(1.0), Count(mark(), "trays", 2), until=enough))
    run.pass_time(10.0)
    assert [note.value for note in run.all(Counted)] == [2, 4, 6]
    assert run.state.ended is Ending.COMPLETED


def test_a_loop_until_looks_before_its_first_lap() -> None:
    run = start(repeat(wait(1.0), until=condition(compare(Quantity.ELAPSED, ">=", 0.0))), say("on"))
    assert told(run) == ["on"]


def test_laps_in_a_condition_are_those_of_the_innermost_loop() -> None:
    second = condition(compare(Quantity.LAPS, "=", 2.0))
    inner = repeat(wait(1.0), When(mark(), second, (say("second"),), ()), times=3)
    run = start(repeat(inner, times=2))
    run.pass_time(10.0)
    assert told(run) == ["second", "second"]


def test_laps_at_an_interval_begin_that_far_apart() -> None:
    run = start(repeat(wait(10.0), times=3, every=60.0))
    run.pass_time(59.0)
    assert len(run.all(StepBegan)) == 2
    run.pass_time(200.0)
    assert run.state.ended is Ending.COMPLETED


@pytest.mark.parametrize(("overrun", "second_begins"), [(Overrun.AT_ONCE, 90.0), (Overrun.NEXT_INTERVAL, 120.0)])
def test_a_lap_that_overruns_is_followed_as_written(overrun: Overrun, second_begins: float) -> None:
    run = start(repeat(wait(90.0), times=2, every=60.0, overrun=overrun))
    run.pass_time(second_begins - 0.5)
    assert len(run.all(StepBegan)) == 2
    run.pass_time(1.0)
    assert len(run.all(StepBegan)) == 3


def test_skipping_the_pause_between_laps_begins_the_next_at_once() -> None:
    run = start(repeat(wait(10.0), times=2, every=600.0))
    run.pass_time(20.0)
    run.person(Event.SKIP)
    assert [note.laps for note in run.all(StepBegan)][1:] == [(1,), (2,)]


def test_skipping_a_held_pause_begins_the_next_lap_too() -> None:
    run = start(repeat(wait(10.0), times=2, every=600.0))
    run.pass_time(20.0)
    run.person(Event.HOLD)
    run.person(Event.SKIP)
    assert [note.laps for note in run.all(StepBegan)][1:] == [(1,), (2,)]


def test_a_loop_for_ever_ends_at_the_end_by_time() -> None:
    run = start(repeat(wait(10.0), every=600.0), end_by=20 * 3600.0)
    run.pass_time(3 * 3600.0)
    assert run.state.ended is Ending.TIMED_OUT
    assert len(run.all(StepBegan)) == 13


PLACES = [HOME, FAR, SIDE]


def drive_all(run: Driver) -> list[str]:
    while run.state.ended is None:
        run.goal(Event.ARRIVED)
    return [command.place for command in run.all(Go)]


def test_nearest_goes_to_what_is_nearest_by_route_each_time() -> None:
    run = start(replace(visit([FAR, SIDE, HOME]), order=Order.NEAREST))
    assert drive_all(run) == ["home", "side", "far end"]


def test_nearest_after_a_failed_leg_goes_by_where_the_robot_stands() -> None:
    visiting = replace(visit([FAR, SIDE], rule("once", 1, ()), Otherwise.SKIP), order=Order.NEAREST)
    run = start(go(HOME), replace(visiting, places=(*visiting.places, (mark(), HOME))))
    run.see(None)
    run.goal(Event.ARRIVED)
    run.goal(Event.REFUSED)
    assert [command.place for command in run.all(Go)] == ["home", "home", "side"]


def test_shuffled_visits_each_place_once_by_the_seed_and_another_way_each_time() -> None:
    def ways(seed: int) -> list[str]:
        machine = compile_mission(mission(repeat(replace(visit(PLACES), order=Order.SHUFFLED), times=8)))
        run = Driver(machine)
        run.state = replace_state(run, seed)
        return drive_all(run)

    def replace_state(run: Driver, seed: int):  # type: ignore[no-untyped-def]
        from runner.engine.advance import advance
        from runner.engine.state import initial_state

        run.effects.clear()
        state, effects = advance(run.machine, initial_state(run.machine), Begin(0.0, 0.0, seed))
        run.effects += effects
        return state

    laps = [tuple(ways(3)[lap * 3 : lap * 3 + 3]) for lap in range(8)]
    assert all(sorted(lap) == sorted(place.name for place in PLACES) for lap in laps)
    assert len(set(laps)) > 1
    assert ways(3) == ways(3)
    assert ways(3) != ways(4)


def test_shortest_is_worked_out_before_the_robot_moves() -> None:
    run = start(replace(visit([FAR, SIDE]), order=Order.SHORTEST))
    assert drive_all(run) == ["side", "far end"]


def test_a_visit_may_do_a_routine_at_each_place() -> None:
    at_far: tuple[Step, ...] = (go(FAR), say("at far end"))
    at_side: tuple[Step, ...] = (go(SIDE), say("at side"))
    run = start(replace(visit([FAR, SIDE]), each=(at_far, at_side)))
    drive_all(run)
    assert told(run) == ["at far end", "at side"]


def test_a_routine_is_its_steps() -> None:
    run = start(Run(mark(), "hand over", (wait(1.0), say("handed over"))), say("on"))
    run.pass_time(1.0)
    assert told(run) == ["handed over", "on"]


@pytest.mark.parametrize(("completed", "ending"), [(True, Ending.COMPLETED), (False, Ending.GIVEN_UP)])
def test_end_ends_the_mission_there_with_its_reason(completed: bool, ending: Ending) -> None:
    run = start(repeat(wait(1.0), End(mark(), completed, "enough for tonight"), times=5))
    run.pass_time(1.0)
    assert run.all(Ended) == [Ended(ending, "enough for tonight")]


def test_a_relative_move_is_a_leg_like_any_other() -> None:
    from runner.site.values import Place, Pose

    run = start(replace(go(Place("ahead 3 m", Pose(3.0, 0.0, 0.0))), relative=True))
    assert (run.all(Go)[0].relative, run.all(Go)[0].pose.x) == (True, 3.0)
    run.goal(Event.ARRIVED)
    assert run.all(LegEnded)[0].place == "ahead 3 m"


def test_a_loop_until_proven_stops_when_the_claim_is_proved() -> None:
    proved = condition(Expression(Kind.PROVEN))
    machine = compile_mission(mission(repeat(go(FAR), until=proved), prove=Prove(0.95, 0.90)))
    run = Driver(machine)
    drive_all(run)
    assert run.state.legs_arrived == 71
