"""What is wrong with a file, where, and what to write instead; and how that is shown to a person.

A diagnostic is a place in the text, a sentence that says what is wrong, and a help that says what to write. They are
shown like this, in ASCII, with the caret under the first character whatever stands before it:

    evening-round.yaml:24:13: error: There is no place called "ward eest".
      - visit: [ward eest, laboratory]
                ^~~~~~~~~
      The nearest place is "ward east".
"""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from enum import Enum

from runner.language.mission import Mark, Source

LINE_WIDTH = 100
"""Characters of a source line that are shown; a longer one is cut around the caret."""

WORD_WIDTH = 40
"""Characters of an author's word that are repeated in a sentence."""

TAB_WIDTH = 4
"""Columns a tab is shown as, wherever it stands, so that the caret needs no guess about tab stops."""

WHOLE_FILE = 0
"""The line of a mark that means the file as such, where there is no text to point at."""


class Severity(Enum):
    """How bad it is: an error stops the mission from being read."""

    ERROR = "error"
    WARNING = "warning"
    NOTE = "note"


@dataclass(frozen=True, slots=True)
class Diagnostic:
    """One finding: `sentence` says what is wrong, `help` what to write instead (may be empty)."""

    mark: Mark
    sentence: str
    help: str = ""
    severity: Severity = Severity.ERROR


class LanguageError(Exception):
    """A file cannot be read: all its problems, sorted by place, and the texts they are in."""

    def __init__(self, diagnostics: Iterable[Diagnostic], sources: Iterable[Source] = ()) -> None:
        self.sources = tuple(sources)
        self.diagnostics = in_order(diagnostics, self.sources)
        super().__init__(self.diagnostics, self.sources)

    def __str__(self) -> str:
        return render(self.diagnostics, self.sources)


def in_order(diagnostics: Iterable[Diagnostic], sources: Sequence[Source]) -> tuple[Diagnostic, ...]:
    """Sorted by file (in the order the files were opened), line and column."""
    rank = {source.path: number for number, source in enumerate(sources)}
    return tuple(
        sorted(diagnostics, key=lambda found: (rank.get(found.mark.file, -1), found.mark.line, found.mark.column))
    )


def render(diagnostics: Sequence[Diagnostic], sources: Sequence[Source], ascii_only: bool = True) -> str:
    """All diagnostics as text, a blank line between them.

    With `ascii_only` other characters of the author's text are shown as escapes; without it they are shown as they
    are, for a terminal that can.
    """
    lines = {source.path: source_lines(source.text) for source in sources}
    return "\n\n".join(_render_one(found, lines.get(found.mark.file, []), ascii_only) for found in diagnostics)


def source_lines(text: str) -> list[str]:
    """The lines of a text as the reader counts them: ended by LF, CR LF or CR and by nothing else."""
    return text.removeprefix("\ufeff").replace("\r\n", "\n").replace("\r", "\n").split("\n")


def nearest_word(word: str, known: Iterable[str]) -> str | None:
    """The known word that looks most like `word`, None where none does."""
    from difflib import get_close_matches

    folded = {candidate.casefold(): candidate for candidate in known}
    close = get_close_matches(word[:WORD_WIDTH].casefold(), folded, n=1, cutoff=0.6)
    return folded[close[0]] if close else None


def nearest(word: str, known: Iterable[str], kind: str) -> str:
    """A help that names the known word nearest to `word`, or else all of them: `kind` is "place", "step" and so on."""
    known = list(known)
    close = nearest_word(word, known)
    if close is not None:
        return f"The nearest {kind} is {quoted(close)}."
    names = [shown(name) for name in known]
    if not names:
        return ""
    more = f" and {len(names) - 12} more" if len(names) > 12 else ""
    return f"Known: {', '.join(names[:12])}{more}."


def quoted(word: str) -> str:
    """A word of the author in double quotes, cut if long, in ASCII."""
    return f'"{shown(word)}"'


def shown(word: str) -> str:
    """A word of the author fit to stand in a sentence: on one line, cut if long, in ASCII."""
    short = word if len(word) <= WORD_WIDTH else word[: WORD_WIDTH - 3] + "..."
    return "".join(_escaped(character) for character in short)


def _render_one(found: Diagnostic, lines: list[str], ascii_only: bool) -> str:
    mark = found.mark
    position = "" if mark.line == WHOLE_FILE else f"{mark.line}:{mark.column}:"
    file = shown_path(mark.file) if ascii_only else mark.file
    parts = [f"{file}:{position} {found.severity.value}: {found.sentence}"]
    if 0 < mark.line <= len(lines) and lines[mark.line - 1].strip():
        parts += _excerpt(lines[mark.line - 1], mark, ascii_only)
    if found.help:
        parts.append(f"  {found.help}")
    return "\n".join(parts)


def shown_path(path: str) -> str:
    """A path in ASCII, whole."""
    return "".join(_escaped(character) for character in path)


def _excerpt(line: str, mark: Mark, ascii_only: bool) -> list[str]:
    """The line, cut around the marked stretch, and the caret line under it."""
    column = min(mark.column - 1, len(line))
    start = max(0, min(column - LINE_WIDTH // 2, len(line) - LINE_WIDTH)) if len(line) > LINE_WIDTH else 0
    stop = min(len(line), start + LINE_WIDTH)
    show = _ascii_cell if ascii_only else _printable_cell
    before = "".join(show(character) for character in line[start:column])
    marked = "".join(show(character) for character in line[column : min(column + mark.width, stop)])
    after = "".join(show(character) for character in line[column + len(line[column : column + mark.width]) : stop])
    lead, tail = ("..." if start else ""), ("..." if stop < len(line) else "")
    caret = " " * _columns(lead + before) + "^" + "~" * (max(_columns(marked), 1) - 1)
    return [f"  {lead}{before}{marked}{after}{tail}", f"  {caret}"]


def _ascii_cell(character: str) -> str:
    return " " * TAB_WIDTH if character == "\t" else _escaped(character)


def _printable_cell(character: str) -> str:
    if character == "\t":
        return " " * TAB_WIDTH
    return character if character.isprintable() else _escaped(character)


def _escaped(character: str) -> str:
    if " " <= character <= "~":
        return character
    return character.encode("unicode_escape").decode("ascii")


def _columns(text: str) -> int:
    """Columns of a terminal that a text takes: two for wide characters, none for combining ones."""
    if text.isascii():
        return len(text)
    return sum(
        0 if unicodedata.combining(character) else 2 if unicodedata.east_asian_width(character) in "WF" else 1
        for character in text
    )
