"""One reading of one or several files: their texts, and every problem found in them, until all is told at once.

A `Reading` spans a mission with its site and robot. A `Page` is one of its files; readers report problems to it by the
node at fault, carry on with a stand-in value, and `Reading.close` raises once at the end if there was any problem.
"""

from __future__ import annotations

import os
import stat
from collections.abc import Callable
from pathlib import Path
from typing import TypeVar

from runner.language.decoding import BYTES_MOST, decode
from runner.language.diagnostics import WHOLE_FILE, Diagnostic, LanguageError, nearest, quoted, shown_path, source_lines
from runner.language.mission import Mark, Source
from runner.language.nodes import Mapping, Node, Scalar, parse, width_of
from runner.language.quantities import PhraseError

PROBLEMS_MOST = 100
"""Nobody reads more; reading stops there, which also bounds the time a hostile file can take."""

PHRASE_MOST = 200
"""Characters of a phrase; the longest sensible one has some fifty. Bounds what matching a hostile one can cost."""

Value = TypeVar("Value")


class Reading:
    """The files read so far and the problems found in them."""

    def __init__(self) -> None:
        self.problems: list[Diagnostic] = []
        self.sources: list[Source] = []

    def open(self, path: Path, blame: tuple[Page, Node] | None = None) -> Page | None:
        """The page of a file, or None after a report: at `blame`, the node that names the file, if there is one."""
        try:
            data = _read_bytes(path)
        except (OSError, ValueError) as error:
            sentence, help_text = _cannot_open(path, error)
            if blame is None:
                self.report(Diagnostic(Mark(str(path), WHOLE_FILE, 1), sentence, help_text))
            else:
                blame[0].report(blame[1], sentence, help_text)
            return None
        page = Page(self, str(path))
        text = decode(data, page.report_at)
        if text is None:
            self.sources.append(Source(page.file, data[:BYTES_MOST].decode("utf-8", errors="replace")))
            return None
        return self._parsed(page, text)

    def open_text(self, text: str, file: str) -> Page | None:
        """The page of a text that is at hand already, under the name `file`."""
        page = Page(self, file)
        decoded = decode(text.encode("utf-8", errors="surrogatepass"), page.report_at)
        if decoded is None:
            self.sources.append(Source(file, text[:BYTES_MOST]))
            return None
        return self._parsed(page, decoded)

    def _parsed(self, page: Page, text: str) -> Page | None:
        self.sources.append(Source(page.file, text))
        root = parse(text, page.report_at)
        if root is None:
            return None
        if not isinstance(root, Mapping):
            page.report(root, "This file does not consist of keys and values.", "Write one `key: value` a line.")
            return None
        page.root = root
        return page

    def report(self, problem: Diagnostic) -> None:
        """Keeps a problem; the hundredth ends the reading."""
        self.problems.append(problem)
        if len(self.problems) >= PROBLEMS_MOST:
            self.close()

    def close(self) -> None:
        """Raises `LanguageError` with all problems, if there are any."""
        if self.problems:
            raise LanguageError(self.problems, self.sources)


class Page:
    """One file being read."""

    def __init__(self, reading: Reading, file: str) -> None:
        self.reading = reading
        self.file = file
        self.root: Mapping | None = None

    def lines(self) -> list[str]:
        """The lines of the text."""
        return next((source_lines(source.text) for source in self.reading.sources if source.path == self.file), [])

    def mark(self, node: Node) -> Mark:
        """Where a node stands. A block mapping is shown by its first key."""
        if isinstance(node, Mapping) and node.start.line != node.end.line and node.pairs:
            node = next(iter(node.pairs.values()))[0]
        return Mark(self.file, node.start.line + 1, node.start.column + 1, width_of(node))

    def pair_mark(self, key: Scalar, value: Node) -> Mark:
        """Where `key: value` stands: all of it where it is on one line, else the key."""
        last = value if value.end.line == key.start.line else key
        width = last.end.column - key.start.column
        return Mark(self.file, key.start.line + 1, key.start.column + 1, max(width, 1))

    def report_at(self, line: int, column: int, width: int, sentence: str, help_text: str) -> None:
        """A problem at a line and column counted from 0."""
        self.reading.report(Diagnostic(Mark(self.file, line + 1, column + 1, width), sentence, help_text))

    def report(self, where: Node | Mark, sentence: str, help_text: str = "") -> None:
        """A problem at a node."""
        mark = where if isinstance(where, Mark) else self.mark(where)
        self.reading.report(Diagnostic(mark, sentence, help_text))

    def text(self, node: Node, what: str, example: str) -> str | None:
        """The text of a scalar, or None after a report. `what` reads as in "a place is meant here"."""
        if isinstance(node, Scalar) and node.text:
            return node.text
        found = "Nothing is written" if isinstance(node, Scalar) else "A list or mapping is written"
        self.report(node, f"{found} where {what} is meant.", f"Write for example {example}.")
        return None

    def phrase(self, node: Node, read: Callable[[str], Value], stand_in: Value, what: str, example: str) -> Value:
        """What `read` makes of a scalar; `stand_in` after a report, for reading to go on."""
        text = self.text(node, what, example)
        if text is None or not isinstance(node, Scalar):
            return stand_in
        if len(text) > PHRASE_MOST:
            self.report(node, f"This is too long for {what}.", f"Write for example {example}.")
            return stand_in
        try:
            return read(text)
        except PhraseError as error:
            self.report(self.part_mark(node, error.start, error.end), error.sentence, error.help)
            return stand_in

    def part_mark(self, node: Node, start: int, end: int) -> Mark:
        """The mark of some characters of a scalar; of all of it where escapes or line breaks hide their place."""
        mark = self.mark(node)
        if not isinstance(node, Scalar):
            return mark
        quotes = 1 if node.style in ("'", '"') else 0
        if node.start.line != node.end.line or mark.width != len(node.text) + 2 * quotes:
            return mark
        return Mark(self.file, mark.line, mark.column + quotes + start, max(end - start, 1))


def _read_bytes(path: Path) -> bytes:
    """At most one byte more than a file may have; OSError for what is no regular file."""
    with open(path, "rb", opener=_open_without_waiting) as stream:
        if not stat.S_ISREG(os.fstat(stream.fileno()).st_mode):
            raise IsADirectoryError
        return stream.read(BYTES_MOST + 1)


def _open_without_waiting(path: str, flags: int) -> int:
    return os.open(path, flags | getattr(os, "O_NONBLOCK", 0))


def _cannot_open(path: Path, error: Exception) -> tuple[str, str]:
    """Sentence and help for a file that cannot be read."""
    if isinstance(error, IsADirectoryError):
        return f"{shown_path(str(path))} is not a file.", "Name a file that ends in .yaml."
    if isinstance(error, FileNotFoundError):
        return f"There is no file {shown_path(str(path))}.", _nearest_file(path)
    if isinstance(error, PermissionError):
        return f"{shown_path(str(path))} may not be read.", "Ask its owner for permission to read it."
    reason = error.strerror if isinstance(error, OSError) and error.strerror else "its name is not a file name"
    return f"{shown_path(str(path))[:200]} cannot be read: {reason}.", ""


def _nearest_file(path: Path) -> str:
    try:
        names = sorted(entry.name for entry in path.parent.iterdir() if entry.suffix in (".yaml", ".yml"))
    except OSError:
        return f"There is no folder {quoted(str(path.parent))} either."
    return nearest(path.name, names, "file in that folder") or "There are no .yaml files in that folder."
