"""How a diagnostic looks: position, line, caret, help; in ASCII and with the caret in its place whatever the line."""

from __future__ import annotations

import pytest

from runner.language.diagnostics import Diagnostic, LanguageError, Severity, render
from runner.language.mission import Mark, Source
from tests.language import texts


def shown(line: str, column: int, width: int, ascii_only: bool = True) -> list[str]:
    """The source line and the caret line, as rendered for a mark in a text of one line."""
    found = Diagnostic(Mark("round.yaml", 1, column, width), "Something is wrong.")
    return render([found], [Source("round.yaml", line)], ascii_only).split("\n")[1:]


def test_position_sentence_line_caret_and_help_stand_below_each_other() -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission("steps:\n  - visit: [ward eest, laboratory]\n")
    assert str(caught.value) == (
        'round.yaml:6:13: error: There is no place called "ward eest".\n'
        "    - visit: [ward eest, laboratory]\n"
        "              ^~~~~~~~~\n"
        '  The nearest place is "ward east".'
    )


def test_several_diagnostics_are_parted_by_a_blank_line() -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission("steps:\n  - wait: 2\n  - wait: 3\n")
    assert str(caught.value).count("\n\n") == 1


def test_a_warning_says_that_it_is_one() -> None:
    found = Diagnostic(Mark("round.yaml", 1, 1), "Nobody goes there.", severity=Severity.WARNING)
    assert render([found], []) == "round.yaml:1:1: warning: Nobody goes there."


def test_a_mark_of_a_whole_file_has_no_line_and_no_caret() -> None:
    found = Diagnostic(Mark("round.yaml", 0, 1), "There is no file round.yaml.")
    assert render([found], []) == "round.yaml: error: There is no file round.yaml."


def test_the_caret_stands_under_the_word_after_tabs() -> None:
    line, caret = shown("\t\tgo: there", 7, 5)
    assert line[caret.index("^") :] == "there"


def test_the_caret_stands_under_the_word_after_escaped_characters() -> None:
    line, caret = shown("go: caf\u00e9 there", 10, 5)
    assert line == "  go: caf\\xe9 there"
    assert line[caret.index("^") :] == "there"
    assert line.isascii()


def test_wide_characters_take_two_columns_where_they_are_shown() -> None:
    line, caret = shown("go: \u65e5\u672c there", 8, 5, ascii_only=False)
    assert line == "  go: \u65e5\u672c there"
    assert caret == " " * (2 + 4 + 4 + 1) + "^~~~~"


def test_combining_characters_take_no_column_where_they_are_shown() -> None:
    _, caret = shown("go: e\u0301 there", 8, 5, ascii_only=False)
    assert caret.index("^") == len("  go: e ")


def test_a_very_long_line_is_cut_around_the_caret() -> None:
    line, caret = shown("a " * 5_000 + "there" + " b" * 5_000, 10_001, 5)
    assert len(line) < 120
    assert line.startswith("  ...")
    assert line.endswith("...")
    assert line[caret.index("^") :].startswith("there")


def test_a_mark_wider_than_the_cut_line_is_cut_with_it() -> None:
    line, caret = shown("x" * 5_000, 1, 5_000)
    assert len(caret) <= len(line)


def test_sentences_are_ascii_whatever_the_author_wrote() -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission("steps:\n  - go: caf\u00e9 \u65e5\n")
    assert str(caught.value).isascii()
    assert r'called "caf\xe9 \u65e5"' in caught.value.diagnostics[0].sentence


def test_problems_in_the_site_come_after_those_of_the_mission() -> None:
    mission, site = Source("b.yaml", "x"), Source("a.yaml", "x")
    ours, theirs = Diagnostic(Mark("b.yaml", 9, 1), "Ours."), Diagnostic(Mark("a.yaml", 1, 1), "Theirs.")
    assert LanguageError([theirs, ours], [mission, site]).diagnostics == (ours, theirs)
