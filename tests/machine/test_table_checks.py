"""The checks on the table find what they are for: each is shown a machine with one thing broken."""

from __future__ import annotations

from dataclasses import replace

import pytest

from runner.machine.compiler import compile_mission
from runner.machine.leg import DRIVE, TRY_OVER
from runner.machine.table import Event, Exit, Fragment, Machine, Row, State
from runner.machine.table_checks import check_table
from tests.builders import FAR, SIDE, go, mission, repeat, rule, wait


def machine_of_a_round() -> Machine:
    return compile_mission(mission(go(FAR), repeat(go(SIDE), wait(5.0), times=3)))


def with_state(machine: Machine, fragment: str, number: int, state: State) -> Machine:
    whole = machine.fragments[fragment]
    states = (*whole.states[:number], state, *whole.states[number + 1 :])
    return replace(machine, fragments={**machine.fragments, fragment: replace(whole, states=states)})


def names(machine: Machine) -> list[str]:
    return [finding.name for finding in check_table(machine)]


def test_a_compiled_round_has_no_findings() -> None:
    assert names(machine_of_a_round()) == []


@pytest.mark.parametrize("event", [Event.ARRIVED, Event.NO_ROUTE, Event.STALLED, Event.GIVE_UP_TIME])
def test_a_state_without_a_row_for_an_event_that_can_reach_it_is_found(event: Event) -> None:
    machine = compile_mission(mission(go(FAR, rule(give_up_after=60.0))))
    drive = machine.fragments["leg, rule patient"].states[DRIVE]
    rows = tuple(row for row in drive.rows if row.event is not event)
    broken = with_state(machine, "leg, rule patient", DRIVE, replace(drive, rows=rows))
    findings = check_table(broken)
    assert [finding.name for finding in findings] == ["no-way-out"]
    assert event.value in findings[0].diagnostic.sentence


def test_no_row_is_asked_for_an_event_that_cannot_happen() -> None:
    machine = compile_mission(mission(go(FAR, rule(give_up_after=None))))
    drive = machine.fragments["leg, rule patient"].states[DRIVE]
    rows = tuple(row for row in drive.rows if row.event is not Event.GIVE_UP_TIME)
    assert names(with_state(machine, "leg, rule patient", DRIVE, replace(drive, rows=rows))) == []


def test_rows_taken_at_once_that_may_all_be_closed_are_found() -> None:
    machine = machine_of_a_round()
    state = machine.fragments["leg, rule patient"].states[TRY_OVER]
    assert names(with_state(machine, "leg, rule patient", TRY_OVER, replace(state, rows=state.rows[:-1])))[0] == (
        "no-way-out"
    )


def test_a_person_can_act_in_every_state_or_it_is_found() -> None:
    machine = machine_of_a_round()
    without_abort = tuple(row for row in machine.anywhere if row.event is not Event.ABORT)
    assert set(names(replace(machine, anywhere=without_abort))) == {"no-way-out"}


def test_an_exit_that_leads_nowhere_is_found_at_its_step() -> None:
    machine = machine_of_a_round()
    leg = machine.start[0]
    broken = replace(
        machine.blocks[leg], exits=tuple(pair for pair in machine.blocks[leg].exits if pair[0] is Exit.NEXT)
    )
    findings = check_table(replace(machine, blocks=(*machine.blocks[:leg], broken, *machine.blocks[leg + 1 :])))
    assert {finding.name for finding in findings} == {"no-way-out"}
    assert 'the step "go to far end"' in findings[0].diagnostic.sentence


def test_a_step_that_nothing_leads_to_is_found() -> None:
    machine = machine_of_a_round()
    stray = replace(machine.blocks[machine.start[0]], step=1)
    assert names(replace(machine, blocks=(*machine.blocks, stray))) == ["unreachable-step"]


def test_a_state_that_nothing_leads_to_is_found() -> None:
    machine = machine_of_a_round()
    waiting = machine.fragments["wait"]
    stray = Fragment("wait", (*waiting.states, State("stray", (Row(Event.WAIT_OVER, Exit.NEXT),))))
    assert names(replace(machine, fragments={**machine.fragments, "wait": stray})) == ["unreachable-state"]


def test_a_loop_in_which_no_time_passes_is_found() -> None:
    machine = compile_mission(mission(repeat(wait(5.0), times=3)))
    instant = Fragment("wait", (State("wait", (Row(Event.AT_ONCE, Exit.NEXT),)),))
    findings = check_table(replace(machine, fragments={**machine.fragments, "wait": instant}))
    assert [finding.name for finding in findings] == ["no-time-passes"]


def test_the_checks_take_time_in_proportion_to_the_steps() -> None:
    """Ten thousand steps, forward and in a loop, are checked without recursion running out."""
    steps = [wait(1.0)] * 10_000
    assert names(compile_mission(mission(*steps, repeat(*steps, times=2)))) == []
