"""Files as a slip of the hand or a hostile mind would make them, and what reading one must keep to."""

from __future__ import annotations

import random
import re
import tempfile
from collections.abc import Callable
from pathlib import Path

from runner.language.diagnostics import LanguageError, source_lines
from runner.language.mission import Mission
from runner.language.reader import read_conditions, read_mission, read_site
from runner.machine.compiler import compile_mission
from runner.machine.table_checks import check_table
from runner.site.values import Place
from tests.language import everything, texts
from tests.language.test_missions import WHOLE
from tests.language.test_sites import EXAMPLES

SITE = texts.site()
MISSIONS = [texts.HEAD + WHOLE, everything.MISSION, everything.MISSION]
BEGINNINGS = [*MISSIONS, texts.SITE, texts.DRAWN, *EXAMPLES]
SCRAPS = [
    *":-[]{},#&*!|>'\"%@`?~\\\t\n\r\0 <=()",
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
    " and ",
    " or ",
    "not ",
    " for 10 s",
    "{room}",
    "run: both",
    "each: knock",
    "include: [shared.yaml]\n",
    "ahead 2 m",
]
_WORD = re.compile(r"[^\s\[\]{},:]+(?: [^\s\[\]{},:]+)?")
_WORDS = [match.group() for text in MISSIONS for match in _WORD.finditer(text)]
_FOLDER = tempfile.TemporaryDirectory(prefix="trundle-mutations-")
_FILE = str(Path(_FOLDER.name) / "file.yaml")
(Path(_FOLDER.name) / "shared.yaml").write_text(everything.SHARED)


def mutated(source: random.Random, text: str) -> str:
    """A text with a few cuts, copies, scraps, moved pieces and exchanged words."""
    for _ in range(source.choice((1, 1, 1, 2, 3, 6))):
        at, end = sorted((source.randint(0, len(text)), source.randint(0, len(text))))
        kind = source.randrange(9)
        if kind == 0:
            text = text[:at] + source.choice(SCRAPS) + text[at:]
        elif kind == 1:
            text = text[:at] + text[min(end, at + 12) :]
        elif kind == 2:
            text = text[:end] + text[at : min(end, at + 60)] + text[end:]
        elif kind == 3:
            text = text[:at] + source.choice(SCRAPS) + text[min(at + source.randint(1, 8), len(text)) :]
        elif kind > 4:
            text = with_another_word(source, text)
        else:
            other = source.choice(BEGINNINGS)
            start = source.randint(0, len(other))
            text = text[:at] + other[start : start + 40] + text[at:]
    return text


def with_another_word(source: random.Random, text: str) -> str:
    """One word of a text exchanged for one of a text that can be read: mostly the YAML stays sound."""
    words = [match.span() for match in _WORD.finditer(text)] or [(0, 0)]
    start, stop = source.choice(words)
    return text[:start] + source.choice(_WORDS) + text[stop:]


def read_as_mission(text: str) -> object:
    return read_mission(text, _FILE, SITE, texts.ROBOT)


def read_as_site(text: str) -> object:
    return read_site(text, _FILE)


def read_as_conditions(text: str) -> object:
    return read_conditions(text, _FILE, SITE)


READERS = (read_as_mission, read_as_site, read_as_conditions)


def check(text: str, readers: tuple[Callable[[str], object], ...] = READERS) -> list[LanguageError | None]:
    """Reads a text as each kind of file; what is wrong with it can be shown, and every mark lies in the text.

    A mission that can be read can be compiled, and its table checked.
    """
    lines = source_lines(text)
    errors = [refusal(read, text) for read in readers]
    for error in filter(None, errors):
        assert str(error).isascii()
        assert error.diagnostics
        for mark in (found.mark for found in error.diagnostics if found.mark.file == _FILE):
            assert 1 <= mark.line <= len(lines)
            assert 1 <= mark.column <= len(lines[mark.line - 1]) + 1
        assert all(found.sentence.endswith(".") for found in error.diagnostics)
    return errors


def refusal(read: Callable[[str], object], text: str) -> LanguageError | None:
    try:
        value = read(text)
    except LanguageError as error:
        return error
    if isinstance(value, Mission):
        check_table(compile_mission(value, _lengths))
    return None


def _lengths(_: Mission, places: tuple[Place, ...]) -> tuple[tuple[float, ...], ...]:
    """Planning on the floor is not what is tried here."""
    return tuple(tuple(float(abs(row - column)) for column in range(len(places))) for row in range(len(places)))
