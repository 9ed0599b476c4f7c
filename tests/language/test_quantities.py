"""Quantities, clock times and phrases: what is written reads as what is meant, with units, and back."""

from __future__ import annotations

import math
from collections.abc import Callable

import pytest
from hypothesis import given
from hypothesis import strategies as st

from runner.language import quantities
from runner.language.mission import Recovery, RecoveryKind, Rest
from runner.language.phrases import parse_facing, parse_recovery, parse_rest, parse_size, parse_span, parse_stall
from runner.language.quantities import (
    DURATION,
    LENGTH,
    SPEED,
    Amount,
    Count,
    Measure,
    PhraseError,
    format_quantity,
    parse_clock,
    parse_quantity,
)

MEASURES = [value for value in vars(quantities).values() if isinstance(value, Measure)]


@pytest.mark.parametrize(
    ("text", "measure", "value"),
    [
        ("0.3 m", LENGTH, 0.3),
        ("40 cm", LENGTH, 0.4),
        ("12 s", DURATION, 12.0),
        ("4 min", DURATION, 240.0),
        ("2 h", DURATION, 7200.0),
        ("0.8 m/s", SPEED, 0.8),
        ("5 km/h", SPEED, 5.0 / 3.6),
        ("95 %", quantities.SHARE, 0.95),
        ("30 deg", quantities.ANGLE, math.pi / 6.0),
        ("-20cm", LENGTH, -0.2),
        ("012 s", DURATION, 12.0),
    ],
)
def test_a_number_with_its_unit_is_read(text: str, measure: Measure, value: float) -> None:
    assert parse_quantity(text, measure) == pytest.approx(value, rel=1e-12)


@given(st.sampled_from(MEASURES), st.floats(min_value=-1e6, max_value=1e6), st.data())
def test_any_number_with_any_unit_is_the_number_times_the_factor(
    measure: Measure, number: float, data: st.DataObject
) -> None:
    unit = data.draw(st.sampled_from(sorted(measure.units)))
    text = f"{number:.6f} {unit}"
    assert parse_quantity(text, measure) == pytest.approx(float(f"{number:.6f}") * measure.units[unit], rel=1e-14)


@pytest.mark.parametrize("percent", range(101))
def test_hundredths_are_the_nearest_there_are(percent: int) -> None:
    assert parse_quantity(f"{percent} %", quantities.SHARE) == percent / 100


@given(st.sampled_from(MEASURES), st.integers(min_value=-(10**6), max_value=10**6), st.sampled_from([1, 2, 4, 8, 16]))
def test_a_quantity_that_is_written_out_reads_as_the_same_value(measure: Measure, number: int, part: int) -> None:
    value = number / part * next(iter(measure.units.values()))
    assert parse_quantity(format_quantity(value, measure), measure) == pytest.approx(value, rel=1e-14)


@given(st.text(max_size=20), st.sampled_from(MEASURES))
def test_any_other_text_is_refused_within_its_own_length(text: str, measure: Measure) -> None:
    assert points_into(text, lambda words: parse_quantity(words, measure))


@given(st.integers(0, 23), st.integers(0, 59))
def test_every_minute_of_the_day_is_a_clock_time(hours: int, minutes: int) -> None:
    assert parse_clock(f"{hours:02}:{minutes:02}") == hours * 3600 + minutes * 60


@pytest.mark.parametrize("text", ["24:00", "12:60", "6", "06:0", "6 pm", "06:00:00", "", "-1:00"])
def test_what_no_clock_shows_is_refused(text: str) -> None:
    with pytest.raises(PhraseError):
        parse_clock(text)


def test_a_bare_number_is_answered_with_the_units_it_could_have() -> None:
    with pytest.raises(PhraseError) as caught:
        parse_quantity("12", DURATION)
    assert (caught.value.sentence, caught.value.help) == ("A time needs a unit.", "Write 12 s, 12 min or 12 h.")


def test_both_ends_of_a_range_belong_to_it() -> None:
    amount = Amount("A wait", DURATION, "1 s", "24 h")
    assert (amount.read("1 s"), amount.read("24 h")) == (1.0, 86_400.0)
    for text in ("0.9 s", "24.1 h", "-5 s"):
        with pytest.raises(PhraseError):
            amount.read(text)


@pytest.mark.parametrize("text", ["1.5", "1e1", "010", "-1", "+2", "1_0", "ten", "", "51", "99999999999999999999"])
def test_a_count_is_plain_digits_within_its_range(text: str) -> None:
    with pytest.raises(PhraseError):
        Count("The number of tries", 1, 50).read(text)


def test_a_rest_may_double_up_to_a_bound() -> None:
    assert parse_rest("20 s") == Rest(20.0, 1.0, math.inf)
    assert parse_rest("20 s, doubling to 2 min") == Rest(20.0, 2.0, 120.0)


def test_a_stall_is_too_little_progress_in_a_time() -> None:
    assert parse_stall("under 0.3 m of progress in 12 s") == (0.3, 12.0)


@pytest.mark.parametrize(
    ("text", "recovery"),
    [
        ("replan", Recovery(RecoveryKind.REPLAN)),
        ("clear 3 m", Recovery(RecoveryKind.CLEAR, 3.0)),
        ("ease back 0.4 m", Recovery(RecoveryKind.EASE_BACK, 0.4)),
        ("rest 1 min", Recovery(RecoveryKind.REST, 60.0)),
        ("relocate", Recovery(RecoveryKind.RELOCATE)),
    ],
)
def test_each_recovery_is_written_as_its_word_and_amount(text: str, recovery: Recovery) -> None:
    assert parse_recovery(text) == recovery


def test_hours_may_run_over_midnight() -> None:
    assert parse_span("22:00-06:00") == (79_200.0, 21_600.0)
    assert parse_span("22:00 - 06:00") == (79_200.0, 21_600.0)


def test_a_size_is_two_lengths() -> None:
    assert parse_size("60 cm x 0.4 m", Amount("A side", LENGTH, "5 cm", "5 m")) == (0.6, 0.4)


@pytest.mark.parametrize(
    ("text", "degrees"), [("east", 0), ("north", 90), ("west", 180), ("south", 270), ("-90 deg", 270), ("360 deg", 0)]
)
def test_a_facing_is_a_direction_or_an_angle(text: str, degrees: float) -> None:
    assert math.degrees(parse_facing(text)) == pytest.approx(degrees)


@given(st.text(max_size=30))
def test_no_text_breaks_a_phrase(text: str) -> None:
    side = Amount("A side", LENGTH, "5 cm", "5 m")
    for read in (
        parse_rest,
        parse_stall,
        parse_recovery,
        parse_span,
        parse_facing,
        lambda words: parse_size(words, side),
    ):
        assert points_into(text, read)


def points_into(text: str, read: Callable[[str], object]) -> bool:
    """Whether a text is read, or refused at characters that it has."""
    try:
        read(text)
    except PhraseError as error:
        return 0 <= error.start <= error.end <= len(text)
    return True
