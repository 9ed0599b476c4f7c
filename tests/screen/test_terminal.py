"""What a terminal can show."""

from __future__ import annotations

import io
import os

import pytest

from runner.screen.terminal import ascii_only, suitable


@pytest.mark.parametrize(
    ("term", "expected"), [("xterm-256color", True), ("linux", True), ("dumb", False), ("", False)]
)
def test_a_screen_needs_a_terminal_that_can_move_its_cursor(
    term: str, expected: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("TERM", term)
    here, there = os.openpty()
    with os.fdopen(there, "w") as terminal:
        assert suitable(terminal) is expected
    os.close(here)


def test_a_screen_is_not_shown_in_a_file_nor_on_a_closed_stream(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TERM", "xterm")
    closed = io.StringIO()
    closed.close()
    here, there = os.openpty()
    with os.fdopen(there, "w") as terminal:
        assert not suitable(terminal, io.StringIO())
        assert not suitable(terminal, closed)
    os.close(here)


@pytest.mark.parametrize(
    ("environment", "encoding", "expected"),
    [
        ({"LANG": "en_US.UTF-8"}, "utf-8", False),
        ({"LANG": "de_DE.utf8"}, None, False),
        ({}, "utf-8", False),
        ({"LANG": "C"}, "utf-8", True),
        ({"LANG": "en_US.UTF-8", "LC_ALL": "POSIX"}, "utf-8", True),
        ({"LANG": "C", "LC_CTYPE": "C.UTF-8"}, "utf-8", False),
        ({"LANG": "en_US.UTF-8"}, "ascii", True),
        ({"LANG": "en_US.UTF-8", "TERM": "linux"}, "utf-8", True),
        ({"LANG": "en_US.UTF-8", "TRUNDLE_ASCII": "1"}, "utf-8", True),
        ({"LANG": "C", "TRUNDLE_ASCII": "0"}, "ascii", False),
    ],
)
def test_ascii_is_used_where_the_wish_the_locale_the_terminal_or_the_encoding_says_so(
    environment: dict[str, str], encoding: str | None, expected: bool
) -> None:
    assert ascii_only(environment, encoding) is expected
