"""Whatever a file holds, reading it gives a value or a `LanguageError` that can be shown; nothing else, and soon.

`TRUNDLE_FUZZ_SECONDS` sets how long to look for counterexamples, 20 by default.
"""

from __future__ import annotations

import os
import random
import time
from collections.abc import Callable

from hypothesis import given, settings
from hypothesis import strategies as st

from runner.language.diagnostics import LanguageError, source_lines
from runner.language.reader import read_conditions, read_mission, read_site
from tests.language import texts
from tests.language.test_missions import WHOLE
from tests.language.test_sites import EXAMPLES

SECONDS = float(os.environ.get("TRUNDLE_FUZZ_SECONDS", "20"))
SITE = texts.site()
BEGINNINGS = [texts.HEAD + WHOLE, texts.SITE, texts.DRAWN, *EXAMPLES]
SCRAPS = [
    *":-[]{},#&*!|>'\"%@`?~\\\t\n\r\0 ",
    "- ",
    ": ",
    "\n  ",
    "---\n",
    "&a ",
    "*a",
    "<<: *a\n",
    "!!python/object ",
    "\u00e9",
    "\u2028",
    "\ud800",
    "\U0001f600",
    "-1",
    "0",
    "9" * 30,
    "1e9 m",
    ".nan m",
    "0 m",
    "-5 s",
    "24:00",
    "no",
    "null",
    "[[]]",
    "{}",
    "otherwise:\n",
    "steps: ",
]


def mutated(source: random.Random, text: str) -> str:
    """A text with a few cuts, copies, scraps and moved pieces."""
    for _ in range(source.randint(1, 6)):
        at, end = sorted((source.randint(0, len(text)), source.randint(0, len(text))))
        kind = source.randrange(5)
        if kind == 0:
            text = text[:at] + source.choice(SCRAPS) + text[at:]
        elif kind == 1:
            text = text[:at] + text[min(end, at + 12) :]
        elif kind == 2:
            text = text[:end] + text[at : min(end, at + 60)] + text[end:]
        elif kind == 3:
            text = text[:at] + source.choice(SCRAPS) + text[min(at + source.randint(1, 8), len(text)) :]
        else:
            other = source.choice(BEGINNINGS)
            start = source.randint(0, len(other))
            text = text[:at] + other[start : start + 40] + text[at:]
    return text


def check(text: str) -> None:
    """Reads a text as each kind of file; what is wrong with it can be shown, and every mark lies in the text."""
    readers: tuple[Callable[[], object], ...] = (
        lambda: read_mission(text, "file.yaml", SITE, texts.ROBOT),
        lambda: read_site(text, "file.yaml"),
        lambda: read_conditions(text, "file.yaml", SITE),
    )
    lines = source_lines(text)
    for error in filter(None, map(refusal, readers)):
        assert str(error).isascii()
        assert error.diagnostics
        for mark in (found.mark for found in error.diagnostics):
            assert 1 <= mark.line <= len(lines)
            assert 1 <= mark.column <= len(lines[mark.line - 1]) + 1
        assert all(found.sentence.endswith(".") for found in error.diagnostics)


def refusal(read: Callable[[], object]) -> LanguageError | None:
    try:
        read()
    except LanguageError as error:
        return error
    return None


@given(st.sampled_from(BEGINNINGS), st.randoms(use_true_random=False))
@settings(max_examples=300, deadline=None)
def test_a_mutated_file_gives_a_value_or_diagnostics(text: str, source: random.Random) -> None:
    check(mutated(source, text))


@given(st.text(max_size=200))
@settings(max_examples=300, deadline=None)
def test_any_text_gives_a_value_or_diagnostics(text: str) -> None:
    check(text)


def test_no_mutation_found_in_the_time_given_breaks_the_reader() -> None:
    seed = int.from_bytes(os.urandom(4))
    source = random.Random(seed)  # noqa: S311
    ends = time.monotonic() + SECONDS
    tried = 0
    while time.monotonic() < ends:
        text = mutated(source, source.choice(BEGINNINGS))
        try:
            check(text)
        except Exception as error:
            raise AssertionError(f"seed {seed}, text number {tried}: {text!r}") from error
        tried += 1
    assert tried > 0
