"""What the rows of the screen say, for any size."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from runner.host.view import FeedLine, Health, View, Weight
from runner.language.mission import Mark
from runner.machine.table import StepNote
from runner.screen.arrangement import HEADER_ROWS, arrange
from runner.screen.footer import Mode, answers, feed, key_at, keys, rule
from runner.screen.header import header, lost_header
from runner.screen.ink import ASCII, DOTTED, Glyphs, Ink, Row, row_width, wrap
from runner.screen.outline import outline, summary
from runner.screen.words import ends_about
from tests.screen.scripted import ENDED, FEED, HELD, MOVING, NEEDS_YOU, RECOVERING, SCENES, STEPS, TROUBLE, showing

WIDTHS = st.integers(24, 220)
ALPHABETS = st.sampled_from((ASCII, DOTTED))


def _text(rows: list[Row] | tuple[Row, ...]) -> list[str]:
    return ["".join(text for text, _ in row) for row in rows]


@given(columns=st.integers(20, 300), rows=st.integers(8, 120), aspect=st.floats(0.2, 8.0))
def test_every_row_and_column_is_given_out_once(columns: int, rows: int, aspect: float) -> None:
    sizes = arrange(columns, rows, aspect)
    assert min(sizes.floor_rows, sizes.steps_rows - 1, sizes.feed_rows - 1) >= 0
    if sizes.stacked:
        assert sizes.floor_columns == sizes.steps_columns == columns
        body = sizes.floor_rows + sizes.steps_rows
    else:
        assert sizes.floor_columns + sizes.steps_columns == columns
        body = max(sizes.floor_rows, sizes.steps_rows)
    assert HEADER_ROWS + body + 1 + sizes.feed_rows + 1 == rows


@given(width=WIDTHS, glyphs=ALPHABETS, scene=st.sampled_from(sorted(SCENES)))
def test_the_header_is_as_wide_as_the_terminal_and_always_tells_health_and_time(
    width: int, glyphs: Glyphs, scene: str
) -> None:
    view = SCENES[scene]
    rows = header(view, showing(), width, glyphs)
    assert [row_width(row) for row in rows] == [width] * 3
    first = _text(rows)[0]
    assert view.health.value.upper().replace(" ", "") in first.replace(" ", "")
    assert view.clock in first


@given(width=st.integers(60, 220), glyphs=ALPHABETS, scene=st.sampled_from(sorted(SCENES)))
def test_from_sixty_columns_on_the_whole_reason_and_place_are_read(width: int, glyphs: Glyphs, scene: str) -> None:
    view = SCENES[scene]
    said = " ".join(" ".join(_text(header(view, showing(), width, glyphs))).split())
    assert all(word in said for word in view.reason.split())
    assert view.place is None or f"to {view.place}" in said


@pytest.mark.parametrize("width", [50, 60, 80])
def test_a_held_run_says_that_it_is_your_turn_and_an_ended_one_where_its_record_is(width: int) -> None:
    assert "your turn: r releases" in " ".join(_text(header(HELD, showing(), width, ASCII)))
    hint = "trundle report evening-0312"
    long = replace(showing(), report_hint="trundle report evening-specimen-20260312-031200")
    assert any(long.report_hint in row for row in _text(header(ENDED, long, width, ASCII)))
    places = [*header(ENDED, showing(), width, ASCII), *summary(ENDED, hint, 30, ASCII)]
    assert hint in " ".join(_text(places))


def test_before_the_first_view_the_run_is_starting() -> None:
    assert "S T A R T I N G" in _text(header(None, showing(), 80, ASCII))[0]


@given(
    count=st.integers(1, 400),
    at=st.integers(0, 399),
    height=st.integers(4, 60),
    width=st.integers(18, 80),
    glyphs=ALPHABETS,
)
def test_the_current_step_is_always_in_sight_and_marked(
    count: int, at: int, height: int, width: int, glyphs: Glyphs
) -> None:
    steps = [StepNote(f"go to room {number}", number % 4, Mark("m.yaml", 1, 1)) for number in range(count)]
    at %= count
    rows = outline(steps, replace(MOVING, step=at), width, height, glyphs)
    assert len(rows) <= height
    assert all(row_width(row) <= width for row in rows)
    marked = " ".join(text.strip() for row in rows for text, ink in row if ink is Ink.CURRENT)
    assert marked.split() == [glyphs.current, "go", "to", "room", str(at)]
    assert sum(row[0][1] is Ink.TEXT for row in rows) < count or count == 1


def test_laps_tries_recoveries_and_time_stand_below_the_step_under_way() -> None:
    text = _text(outline(STEPS, RECOVERING, 40, 20, ASCII))
    at = next(number for number, line in enumerate(text) if line.startswith(">"))
    assert [line.strip() for line in text[at + 1 : at + 3]] == ["lap 2 of 8, try 1 of 3", "recovery 2 of 15"]
    assert text[at + 3].strip() == "0:22 of 4:00 ==.................."


def test_steps_out_of_sight_are_counted() -> None:
    steps = [StepNote(f"go to room {number}", 0, Mark("m.yaml", 1, 1)) for number in range(100)]
    text = _text(outline(steps, replace(MOVING, step=50), 40, 12, ASCII))
    shown = [int(line.split()[-1]) for line in text if "room" in line]
    assert text[0] == f"  ~ {shown[0]} more above"
    assert text[-1] == f"  ~ {99 - shown[-1]} more below"


@given(width=st.integers(30, 200), height=st.integers(1, 20), glyphs=ALPHABETS)
def test_the_newest_line_of_the_feed_is_always_there_and_long_ones_go_on_below(
    width: int, height: int, glyphs: Glyphs
) -> None:
    rows = feed(FEED, width, height, glyphs)
    assert 1 <= len(rows) <= height
    assert all(row_width(row) <= width for row in rows)
    assert FEED[-1].clock in " ".join(_text(rows))
    assert len(rows) == height or FEED[0].clock in _text(rows)[0]


def test_trouble_is_marked_by_more_than_color() -> None:
    assert [line[:11] for line in _text(feed(FEED, 80, 9, ASCII))][2:4] == [" 03:11:30 !", " 03:11:31 *"]


def test_control_characters_and_letters_the_terminal_lacks_do_not_reach_it() -> None:
    line = FeedLine(0.0, "03:00:00", Weight.PLAIN, "Küche\x1b[31m \u6771")
    assert _text(feed([line], 80, 3, ASCII)) == [" 03:00:00   Kuche?[31m ?"]


def test_the_keys_on_offer_are_those_that_mean_something() -> None:
    def offered(view: View | None, read_only: bool = False) -> str:
        return " ".join(" ".join(_text([keys(view, Mode.WATCHING, read_only, 80, ASCII)])).split())

    assert offered(MOVING) == "h hold s skip a abort + closer ? help q leave"
    assert offered(HELD) == "r release s skip a abort + closer ? help q leave"
    assert offered(TROUBLE) == offered(HELD)
    assert offered(NEEDS_YOU) == "Enter answer h hold s skip a abort + closer ? help q leave"
    assert offered(ENDED) == "+ closer ? help q leave"
    assert offered(MOVING, read_only=True) == "only looking + closer ? help q leave"


@pytest.mark.parametrize("width", [36, 40, 60, 80])
def test_an_abort_that_is_to_be_confirmed_shows_both_of_its_keys(width: int) -> None:
    (text,) = _text([keys(MOVING, Mode.ABORTING, False, width, ASCII)])
    assert len(text) <= width
    assert " y  abort" in text
    assert " Esc  go on" in text


@given(width=st.integers(8, 120), column=st.integers(0, 119), scene=st.sampled_from(sorted(SCENES)))
def test_touching_the_footer_finds_the_key_under_the_finger(width: int, column: int, scene: str) -> None:
    row = keys(SCENES[scene], Mode.WATCHING, False, width, ASCII)
    cap = key_at(row, column)
    assert cap in {"", *(text.strip() for text, ink in row if ink is Ink.KEY)}
    assert column < row_width(row) or cap == ""


@given(
    words=st.lists(st.text("abc def", min_size=1, max_size=40), min_size=1, max_size=8),
    width=st.integers(40, 120),
    height=st.integers(3, 12),
)
def test_the_answers_of_a_question_have_their_digits_and_stay_in_their_place(
    words: list[str], width: int, height: int
) -> None:
    rows = answers("Tray taken?", words, width, height, ASCII)
    assert len(rows) <= height
    assert all(row_width(row) <= width for row in rows)
    digits = [text.strip() for row in rows for text, ink in row if ink is Ink.KEY]
    assert digits == [str(number) for number in range(1, len(digits) + 1)]
    assert len(digits) == len(words) or height * (width // 32) < len(words)


def test_the_legend_explains_the_marks_of_the_floor_if_there_is_one() -> None:
    assert "sensed x" in _text([rule(60, ASCII, True, False)])[0]
    assert "shut by hours =" in _text([rule(80, ASCII, True, True)])[0]
    assert set(_text([rule(60, ASCII, False, False)])[0]) == {"-"}


@given(width=WIDTHS, glyphs=ALPHABETS, remark=st.text(max_size=300))
def test_a_remark_takes_the_place_of_the_legend(width: int, glyphs: Glyphs, remark: str) -> None:
    assert row_width(rule(width, glyphs, True, True, remark)) <= width


@given(width=WIDTHS, glyphs=ALPHABETS, scene=st.sampled_from(sorted(SCENES)), age=st.floats(3.0, 1e5))
def test_the_header_of_old_news_says_since_when(width: int, glyphs: Glyphs, scene: str, age: float) -> None:
    rows = lost_header(SCENES[scene], age, showing(), width, glyphs)
    assert [row_width(row) for row in rows] == [width] * 3
    assert "NONEWS" in _text(rows)[0].replace(" ", "")
    assert SCENES[scene].clock in " ".join(_text(rows)) or width < 40


def test_when_it_ends_is_told_as_far_as_it_is_known() -> None:
    assert ends_about(MOVING) == "repeats until about 05:17"
    assert ends_about(replace(MOVING, repeats_until=None)) == "ends by 05:42"
    assert ends_about(replace(MOVING, repeats_until=99_999.0)) == "ends by 05:42"
    assert ends_about(replace(MOVING, repeats_until=None, ends_by=None)) == ""
    assert ends_about(ENDED) == ""


@given(
    text=st.text(st.characters(codec="utf-8", exclude_categories=("C", "Z", "M")), max_size=80),
    width=st.integers(2, 40),
)
def test_wrapping_loses_nothing_that_fits(text: str, width: int) -> None:
    lines = wrap(text, width, 100, "~")
    assert "".join(lines) == text
    assert all(row_width(((line, Ink.TEXT),)) <= width for line in lines)


def test_every_health_has_a_word_and_a_look() -> None:
    for health in Health:
        assert health.value.upper() in _text(header(replace(MOVING, health=health), showing(), 60, ASCII))[0]
