"""Whatever happens, in whatever order and at whatever time: properties of the engine on random missions."""

from __future__ import annotations

from hypothesis import given, settings
from hypothesis import strategies as st

from runner.engine.advance import advance
from runner.engine.state import initial_state
from runner.engine.values import ActionNews, Begin, Effect, Go, GoalNews, Halt, Input, Operator, Seen, Tick
from runner.engine.watching import next_deadline
from runner.language.mission import Otherwise, Recovery, RecoveryKind, Rest, RetryRule, Step
from runner.machine.codec import from_json, to_json
from runner.machine.compiler import compile_mission
from runner.machine.table import GOAL_ENDS, Event, Machine, Register
from runner.machine.table_checks import check_table
from runner.site.values import Pose
from tests.builders import FAR, HOME, SIDE, go, mission, repeat, rule, visit, wait

recoveries = st.lists(st.sampled_from([Recovery(kind, 2.0) for kind in RecoveryKind]), max_size=4).map(tuple)
rules = st.builds(
    lambda number, tries, recover, give_up: rule(f"rule {number}", tries, recover, Rest(1.0, 2.0, 9.0), give_up),
    st.integers(0, 99),
    st.integers(1, 3),
    recoveries,
    st.none() | st.floats(1.0, 300.0),
)


def same_named_rules_are_the_same(steps: tuple[Step, ...]) -> bool:
    found: dict[str, RetryRule] = {}

    def look(step: object) -> bool:
        under = getattr(step, "rule", None)
        inner = [*getattr(step, "steps", ()), *(o if isinstance(o := getattr(step, "otherwise", None), tuple) else ())]
        return (under is None or found.setdefault(under.name, under) == under) and all(look(each) for each in inner)

    return all(look(step) for step in steps)


def nested(steps: st.SearchStrategy[Step]) -> st.SearchStrategy[Step]:
    several = st.lists(steps, min_size=1, max_size=3)
    return st.one_of(
        st.builds(lambda inner, times: repeat(*inner, times=times), several, st.integers(1, 3)),
        st.builds(lambda inner, seconds: repeat(*inner, seconds=seconds), several, st.floats(1.0, 500.0)),
        st.builds(lambda inner, under: go(SIDE, under, otherwise=tuple(inner)), several, rules),
    )


places = st.sampled_from([HOME, FAR, SIDE])
words = st.none() | st.sampled_from(Otherwise)
leaves: st.SearchStrategy[Step] = st.one_of(
    st.builds(
        go,
        places,
        rules,
        st.none() | st.floats(1.0, 100.0),
        words,
    ),
    st.builds(visit, st.lists(places, min_size=1, max_size=3), rules, words),
    st.builds(wait, st.floats(0.5, 60.0)),
)
missions = (
    st.lists(st.recursive(leaves, nested, max_leaves=6), min_size=1, max_size=4)
    .map(tuple)
    .filter(same_named_rules_are_the_same)
)
happenings = st.lists(
    st.tuples(
        st.sampled_from(["goal", "old goal", "done", "not done", "see", "person", "tick"]),
        st.integers(0, 10_000),
        st.floats(0.0, 40.0),
    ),
    max_size=60,
)


def inputs(machine: Machine, chosen: list[tuple[str, int, float]]) -> tuple[list[Input], list[list[Effect]]]:
    """Play the happenings against the machine, checking what must always hold."""
    state, now = initial_state(machine), 0.0
    given: list[Input] = []
    out: list[list[Effect]] = []

    def give(one: Input) -> None:
        nonlocal state
        before = repr(state)
        old = state
        state, effects = advance(machine, state, one)
        assert repr(old) == before, "the state given is not changed"
        given.append(one)
        out.append(effects)
        fragment = machine.fragments[machine.blocks[state.address[0]].fragment]
        if state.leg is not None and fragment.watch is not None:
            assert 0 <= state.registers[Register.RECOVERIES] <= fragment.recoveries_at_most
            assert 1 <= state.registers[Register.TRIES] <= fragment.tries_at_most
        waits = fragment.states[state.address[1]]
        assert state.ended is not None or all(row.event is not Event.AT_ONCE for row in waits.rows)

    give(Begin(0.0, 64_800.0))
    for what, number, delay in chosen:
        now += delay
        match what:
            case "goal":
                ends = (Event.ARRIVED, *GOAL_ENDS)
                give(GoalNews(now, state.goal or 0, ends[number % len(ends)]))
            case "old goal":
                give(GoalNews(now, number % (state.goals_sent + 1), Event.FAILED))
            case "done" | "not done":
                give(ActionNews(now, state.action or 0, what == "done"))
            case "see":
                give(Seen(now, Pose(0, 0, 0), 0.0, 0.0, 1.0, now / 3, float(number % 50), number % 3, (), ()))
            case "person":
                people = (Event.HOLD, Event.RELEASE, Event.SKIP, Event.HOLD, Event.RELEASE, Event.ABORT)
                give(Operator(now, people[number % len(people)], "someone"))
            case "tick":
                give(Tick(max(now, next_deadline(machine, state) or now)))
                now = max(now, given[-1].stamp)
    return given, out


@given(steps=missions, chosen=happenings)
@settings(max_examples=100, deadline=None)
def test_any_order_of_events_keeps_the_bounds_and_the_same_inputs_give_the_same_effects(
    steps: tuple[Step, ...], chosen: list[tuple[str, int, float]]
) -> None:
    machine = compile_mission(mission(*steps))
    given, out = inputs(machine, chosen)
    again, state = [], initial_state(machine)
    for one in given:
        state, effects = advance(machine, state, one)
        again.append(effects)
    assert again == out


@given(steps=missions, chosen=happenings)
@settings(max_examples=100, deadline=None)
def test_a_goal_is_never_sent_while_another_is_under_way_and_ids_rise(
    steps: tuple[Step, ...], chosen: list[tuple[str, int, float]]
) -> None:
    machine = compile_mission(mission(*steps))
    given, out = inputs(machine, chosen)
    under_way, last = None, 0
    for one, effects in zip(given, out, strict=True):
        if isinstance(one, GoalNews) and one.goal_id == under_way and one.event is not None:
            under_way = None
        for effect in effects:
            if isinstance(effect, Halt):
                under_way = None
            if isinstance(effect, Go):
                assert under_way is None
                assert effect.goal_id == last + 1
                under_way = last = effect.goal_id


@given(steps=missions)
@settings(max_examples=100, deadline=None)
def test_every_mission_compiles_to_a_table_that_passes_the_checks_and_round_trips(steps: tuple[Step, ...]) -> None:
    machine = compile_mission(mission(*steps))
    assert check_table(machine) == []
    assert from_json(to_json(machine)) == machine


@given(steps=missions)
@settings(max_examples=100, deadline=None)
def test_a_robot_that_never_says_anything_but_no_comes_to_an_end(steps: tuple[Step, ...]) -> None:
    """Every goal refused, every action failed: bounded tries and laps end every mission."""
    machine = compile_mission(mission(*steps))
    state, _ = advance(machine, initial_state(machine), Begin(0.0, 64_800.0))
    now = 0.0
    for _ in range(20_000):
        if state.ended is not None:
            return
        now += 1.0
        if state.action is not None:
            state, _ = advance(machine, state, ActionNews(now, state.action, False))
        elif state.goal is not None:
            state, _ = advance(machine, state, GoalNews(now, state.goal, Event.REFUSED))
        else:
            now = max(now, next_deadline(machine, state) or now)
            state, _ = advance(machine, state, Tick(now))
    raise AssertionError("the mission does not end")
