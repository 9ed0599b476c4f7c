"""Least, likely and most by interval arithmetic, and the limits that are judged by them."""

from __future__ import annotations

from dataclasses import replace
from math import inf

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from runner.language.expressions import Expression as Is
from runner.language.expressions import Kind, Quantity
from runner.language.mission import Ask, Charge, Mission, Otherwise, Overrun, Step, Wait, When
from runner.machine.checks import Checked, check_mission
from runner.machine.compiler import compile_mission
from runner.machine.spans import Span, product
from tests.builders import FAR, HOME, SIDE, compare, condition, go, mark, mission, repeat, rule, visit, wait

SIX = 18 * 3600.0


def checked(written: Mission, begins: float = SIX) -> Checked:
    return check_mission(written, compile_mission(written), begins)


def seconds(*steps: Step, **more: object) -> Span:
    made = checked(mission(*steps, **more)).estimates  # type: ignore[arg-type]
    assert made is not None
    return made.seconds


def names(written: Mission, begins: float = SIX) -> set[str]:
    return {finding.name for finding in checked(written, begins).findings}


def test_waits_add_up_exactly() -> None:
    span = seconds(wait(30.0), wait(12.0))
    assert (span.least, span.likely) == (42.0, 42.0)
    assert 42.0 <= span.most <= 45.0


def test_a_leg_is_bounded_by_its_route_and_by_its_limits() -> None:
    span = seconds(go(FAR, within=60.0))
    assert 7.0 / 0.9 - 2.0 < span.least < span.likely < 20.0
    assert 60.0 <= span.most <= 75.0


def test_a_leg_without_time_limits_is_bounded_by_its_tries_recoveries_and_rests() -> None:
    short, long = seconds(go(FAR, rule(tries=1, recover=()))), seconds(go(FAR, rule(tries=3)))
    assert short.most < long.most < inf
    assert long.most > 3 * 4 * 60.0 + 20.0 + 40.0


@given(st.integers(1, 50), st.integers(1, 300))
@settings(max_examples=20, deadline=None)
def test_laps_at_an_interval_begin_that_far_apart(times: int, length: int) -> None:
    span = seconds(repeat(wait(float(length)), times=times, every=60.0))
    assert span.least == (times - 1) * max(60.0, length) + length
    late = seconds(repeat(wait(float(length)), times=times, every=60.0, overrun=Overrun.NEXT_INTERVAL))
    assert late.least == (times - 1) * 60.0 * -(-length // 60) + length


def test_a_loop_until_a_clock_time_ends_within_a_lap_of_it() -> None:
    span = seconds(repeat(wait(100.0), until_clock=SIX + 1000.0))
    assert (span.least, span.likely) == (1000.0, 1000.0)
    assert 1100.0 <= span.most <= 1110.0


def test_what_nothing_bounds_is_infinite() -> None:
    assert seconds(Wait(mark(), None, condition(compare(Quantity.COUNT, ">=", 3.0, "trays")))).most == inf
    proven = condition(Is(Kind.PROVEN))
    assert seconds(repeat(wait(10.0), until=proven)).most == inf


def test_proven_or_a_clock_time_is_bounded_by_the_clock() -> None:
    either = Is(Kind.OR, (Is(Kind.PROVEN), compare(Quantity.CLOCK, ">=", SIX + 600.0)))
    span = seconds(repeat(wait(10.0), until=condition(either)))
    assert (span.least, span.likely) == (0.0, 600.0)
    assert span.most < 625.0


def test_branches_are_joined_and_a_question_takes_up_to_its_time() -> None:
    split = When(mark(), condition(compare(Quantity.COUNT, ">=", 1.0, "x")), (wait(100.0),), (wait(20.0),))
    span = seconds(split)
    assert (span.least, span.likely) == (20.0, 60.0)
    assert span.most >= 100.0
    asked = seconds(Ask(mark(), "Ready?", ("yes",), 30.0, "yes"))
    assert (asked.least, asked.likely) == (0.0, 15.0)


def test_every_order_of_a_visit_has_the_same_bounds_for_its_whole() -> None:
    from runner.language.mission import Order

    spans = [seconds(replace(visit([FAR, SIDE, HOME]), order=order)) for order in (Order.NEAREST, Order.SHUFFLED)]
    assert spans[0] == spans[1]
    assert spans[0].least <= seconds(visit([FAR, SIDE, HOME])).likely <= spans[0].most


def test_laps_of_loops_in_loops_multiply_and_deep_nesting_takes_no_longer() -> None:
    nested: Step = wait(1.0)
    for _ in range(40):
        nested = repeat(nested, times=1)
    assert seconds(repeat(repeat(nested, times=3), times=4)).least == 12.0


def test_ten_thousand_steps_are_estimated() -> None:
    assert seconds(*[wait(1.0), go(FAR), go(HOME)] * 3_333).least > 3_333.0


# --- limits -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("end_by", "name"),
    [(SIX + 30.0, "end-by-missed"), (SIX + 47.0, "end-by-likely-missed"), (SIX + 300.0, "end-by-may-cut")],
)
def test_an_end_by_time_that_cannot_be_kept_is_found(end_by: float, name: str) -> None:
    written = mission(wait(28.0), go(FAR), go(HOME, otherwise=Otherwise.SKIP), end_by=end_by)
    assert [found for found in names(written) if found.startswith("end-by")] == [name]


def test_an_end_by_time_in_the_morning_can_be_kept() -> None:
    assert not any(name.startswith("end-by") for name in names(mission(wait(60.0), end_by=6 * 3600.0)))


def test_a_loop_for_ever_is_meant_to_be_ended_by_the_clock() -> None:
    written = mission(repeat(wait(60.0)), end_by=6 * 3600.0)
    assert not any(name.startswith("end-by") for name in names(written))
    assert seconds(repeat(wait(60.0)), end_by=6 * 3600.0).most == 12 * 3600.0


def test_a_time_limit_below_the_drive_itself_is_an_error_and_a_close_one_a_warning() -> None:
    assert "within-too-short" in names(mission(go(FAR, within=4.0)))
    assert "within-tight" in names(mission(go(FAR, within=10.5)))
    assert not {"within-too-short", "within-tight"} & names(mission(go(FAR, within=60.0)))


def test_a_battery_that_cannot_last_is_an_error_unless_it_is_charged_in_between() -> None:
    """500 Wh at 20 W while standing: 25 hours."""
    day = repeat(wait(3600.0), times=26)
    assert "battery-too-small" in names(mission(day))
    full = condition(compare(Quantity.BATTERY, ">=", 1.0))
    charge = Charge(mark(), HOME, rule(), full, None, Otherwise.SKIP)
    half = repeat(wait(3600.0), times=13)
    assert not {"battery-too-small", "battery-may-not-last"} & names(mission(half, charge, half))
    assert "battery-too-small" in names(mission(repeat(half, charge, half, half, times=2)))


# --- usage --------------------------------------------------------------------------------------------------------


def test_what_is_not_used_and_not_written_is_noted() -> None:
    written = mission(go(FAR, rule("used")), go(SIDE, rule("used"), otherwise=Otherwise.END))
    unused = replace(written, rules=(rule("used"), rule("idle")))
    found = checked(unused).findings
    assert [finding.diagnostic.sentence for finding in found if finding.name == "unused-rule"] == [
        'No step uses the retry rule "idle".'
    ]
    assert sum(finding.name == "default-otherwise" for finding in found) == 1
    assert "place-never-visited" not in names(unused)
    assert "place-never-visited" in names(mission(go(SIDE)))


def test_a_short_order_of_many_places_is_noted() -> None:
    from runner.language.mission import Order

    many = [replace(SIDE, name=f"spot {number}") for number in range(13)]
    assert "order-not-exact" in names(mission(replace(visit(many), order=Order.SHORTEST)))
    assert "order-not-exact" not in names(mission(replace(visit(many[:12]), order=Order.SHORTEST)))


@given(st.floats(0.0, 1e6), st.floats(0.0, 1e6))
def test_nothing_times_infinitely_often_is_nothing(one: float, other: float) -> None:
    assert product(one, other) == one * other
    assert product(0.0, inf) == product(inf, 0.0) == 0.0
