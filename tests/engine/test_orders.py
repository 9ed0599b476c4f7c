"""Standing orders: they act on the edge, once, the first one first, never within each other; and return as written."""

from __future__ import annotations

from dataclasses import replace

from runner.engine.values import Ended, Go, LegEnded, Notified, OrderBegan, OrderEnded, Seen, StartCharging, StepBegan
from runner.language.expressions import Condition, Expression, Kind, Quantity
from runner.language.mission import Charge, Notify, StandingOrder, Step, Then
from runner.machine.compiler import compile_mission
from runner.machine.table import Ending, Event, Outcome
from runner.site.values import Pose
from tests.builders import FAR, HOME, SIDE, compare, condition, go, mark, mission, rule, wait
from tests.engine.driver import Driver

LOW = condition(compare(Quantity.BATTERY, "<", 0.2))
FULL = condition(compare(Quantity.BATTERY, ">=", 0.7))
CHARGE = Charge(mark(), HOME, rule(), FULL, None, None)
LATE = condition(compare(Quantity.ELAPSED, ">=", 100.0))


def order(name: str, when: Condition, *steps: Step, then: Then = Then.CARRY_ON) -> StandingOrder:
    return StandingOrder(mark(), name, when, steps or (Notify(mark(), name),), then)


def start(*steps: Step, orders: tuple[StandingOrder, ...]) -> Driver:
    return Driver(compile_mission(mission(*steps, orders=orders)))


def battery(run: Driver, level: float, remaining: float | None = None) -> None:
    run.now += 0.25
    run.give(Seen(run.now, Pose(1.0, 1.0, 0.0), 0.0, 0.0, level, run.driven, remaining, 1, (), ()))


def told(run: Driver) -> list[str]:
    return [note.text for note in run.all(Notified)]


def test_a_low_battery_interrupts_the_leg_charges_and_carries_on_with_the_same_leg() -> None:
    run = start(go(FAR, within=600.0), orders=(order("low battery", LOW, CHARGE),))
    battery(run, 0.5, 5.0)
    battery(run, 0.19, 4.0)
    assert run.all(Go)[-1].place == "home"
    run.goal(Event.ARRIVED)
    assert len(run.all(StartCharging)) == 1
    battery(run, 0.6)
    run.pass_time(50.0)
    battery(run, 0.7)
    assert run.all(OrderEnded)[0].name == "low battery"
    assert run.all(Go)[-1].place == "far end"
    run.goal(Event.ARRIVED)
    legs = run.all(LegEnded)
    assert [(leg.place, leg.outcome, leg.leg) for leg in legs] == [
        ("home", Outcome.ARRIVED, 2),
        ("far end", Outcome.ARRIVED, 1),
    ]
    assert run.state.ended is Ending.COMPLETED


def test_an_order_acts_once_on_the_edge_and_again_after_its_condition_was_false() -> None:
    run = start(wait(1000.0), orders=(order("low", LOW),))
    for level in (0.5, 0.1, 0.1, 0.15, 0.5, 0.5, 0.1, 0.1):
        battery(run, level)
    assert told(run) == ["low", "low"]


def test_where_two_could_act_the_first_does_and_the_other_after_it() -> None:
    run = start(wait(1000.0), orders=(order("first", LOW), order("second", LOW, wait(5.0)), order("third", LOW)))
    battery(run, 0.1)
    assert [note.name for note in run.all(OrderBegan)] == ["first", "second"]
    run.pass_time(5.0)
    assert [note.name for note in run.all(OrderBegan)] == ["first", "second", "third"]


def test_an_order_never_interrupts_another_and_is_dropped_if_its_condition_is_over_by_then() -> None:
    run = start(wait(1000.0), orders=(order("slow", LATE, wait(60.0)), order("low", LOW)))
    run.pass_time(100.0)
    battery(run, 0.1)
    assert told(run) == []
    battery(run, 0.9)
    run.pass_time(60.0)
    assert told(run) == []


def test_a_persons_hold_keeps_orders_waiting() -> None:
    run = start(wait(1000.0), orders=(order("low", LOW),))
    run.person(Event.HOLD)
    battery(run, 0.1)
    assert told(run) == []
    run.person(Event.RELEASE)
    assert told(run) == ["low"]


def test_a_hold_within_an_order_returns_into_the_order() -> None:
    run = start(wait(1000.0), orders=(order("low", LOW, wait(30.0), Notify(mark(), "done")),))
    battery(run, 0.1)
    run.person(Event.HOLD)
    run.pass_time(500.0)
    run.person(Event.RELEASE)
    run.pass_time(31.0)
    assert told(run) == ["done"]
    assert run.at == "wait"


def test_time_left_of_a_wait_stands_still_during_an_order() -> None:
    run = start(wait(150.0), orders=(order("slow", LATE, wait(400.0)),))
    run.pass_time(500.0)
    assert run.state.ended is None
    run.pass_time(50.0)
    assert run.state.ended is Ending.COMPLETED


def test_repeat_step_begins_the_interrupted_step_anew() -> None:
    run = start(go(SIDE), go(FAR), orders=(order("low", LOW, then=Then.REPEAT_STEP),))
    run.goal(Event.ARRIVED)
    battery(run, 0.1, 5.0)
    assert [(leg.place, leg.outcome) for leg in run.all(LegEnded)][-1] == ("far end", Outcome.INTERRUPTED)
    assert [note.text for note in run.all(StepBegan)].count("go to far end") == 2
    assert run.state.registers[next(iter(run.state.registers))] == 1
    run.goal(Event.ARRIVED)
    assert run.state.ended is Ending.COMPLETED


def test_an_order_may_end_the_mission_and_says_so() -> None:
    run = start(wait(1000.0), orders=(order("low", LOW, then=Then.END),))
    battery(run, 0.1)
    assert run.all(Ended)[0].reason == "the standing order 'low' ended it"


def test_an_abort_within_an_order_ends_the_interrupted_leg_too() -> None:
    run = start(go(FAR), orders=(order("low", LOW, go(SIDE)),))
    battery(run, 0.1, 5.0)
    run.person(Event.ABORT)
    assert [(leg.place, leg.outcome) for leg in run.all(LegEnded)] == [
        ("side", Outcome.ABORTED),
        ("far end", Outcome.ABORTED),
    ]


def test_an_order_may_ask_that_its_condition_has_held_for_a_while() -> None:
    run = start(wait(1000.0), orders=(order("low", replace(LOW, lasting=10.0)),))
    battery(run, 0.1)
    run.pass_time(5.0)
    battery(run, 0.3)
    battery(run, 0.1)
    run.pass_time(9.9)
    assert told(run) == []
    run.pass_time(0.1)
    assert told(run) == ["low"]


def test_an_order_by_time_alone_acts_at_its_time() -> None:
    run = start(wait(1000.0), orders=(order("late", LATE),))
    run.pass_time(99.0)
    assert told(run) == []
    run.pass_time(1.1)
    assert told(run) == ["late"]


def test_the_outcome_of_the_last_leg_can_trigger_an_order() -> None:
    failed = condition(Expression(Kind.LAST_LEG, word="failed"))
    from runner.language.mission import Otherwise

    run = start(
        go(FAR, rule(tries=1, recover=()), otherwise=Otherwise.SKIP), wait(10.0), orders=(order("missed", failed),)
    )
    run.goal(Event.REFUSED)
    assert told(run) == ["missed"]
    assert run.at == "wait"
