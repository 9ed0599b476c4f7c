"""What YAML's parser complains about, said in words that help: which line, what is missing, what to write."""

from __future__ import annotations

from typing import Any

from runner.language.decoding import Report
from runner.language.diagnostics import source_lines

# Part of the parser's problem or context, whether the beginning (context) is the better place to show, the sentence
# and the help. The first row that fits is taken. The wordings are those of libyaml and of PyYAML's own parser.
_WORDINGS: tuple[tuple[str, bool, str, str], ...] = (
    ("unexpected end of stream", True, "This quote is never closed.", "Close it with the same character."),
    ("document indicator", True, "This quote is never closed.", "Close it with the same character."),
    (
        "parsing a flow sequence",
        True,
        "This list is never closed, or lacks a comma.",
        "Write [one, two] with its bracket.",
    ),
    (
        "parsing a flow mapping",
        True,
        "This mapping is never closed, or lacks a comma.",
        "Write {one: 1, two: 2} with its brace.",
    ),
    ("parsing a flow node", False, "A list or mapping is opened here and never closed.", "Close it with ] or }."),
    (
        "mapping values are not allowed",
        False,
        "A colon does not fit here.",
        "Begin a new line before the key, or put a text that holds a colon in quotes.",
    ),
    (
        "parsing a block mapping",
        False,
        "This line does not fit what stands around it.",
        "Give it the same indentation as the keys it belongs to.",
    ),
    (
        "parsing a block collection",
        False,
        "This line does not fit the list above it.",
        "Begin it with a dash, or indent it like the keys above it.",
    ),
    (
        "sequence entries are not allowed",
        False,
        "A list cannot begin here.",
        "Begin the dash on a line of its own, below the key.",
    ),
    ("could not find expected ':'", True, "There is no colon after this key.", "Write key: value."),
    ("cannot start any token", False, "A value cannot begin with this character.", "Put the value in quotes."),
    ("unknown escape", False, "There is no such escape.", "Use single quotes, or write the backslash twice."),
    ("maximum nesting", False, "Here lists and mappings are nested too deep.", "Write it flatter."),
    (
        "did not find expected <document start>",
        False,
        "This does not belong to what stands above.",
        "Give it the same indentation as the lines it belongs to.",
    ),
)
_TAB = ("", False, "A line cannot be indented with a tab.", "Use spaces.")
_OTHER = ("", False, "This is not well-formed YAML.", "Compare it with an example mission.")


def report_syntax(error: Exception, text: str, report: Report) -> None:
    """Reports one error of the parser in `text` at the place where a person would look."""
    place: Any = getattr(error, "problem_mark", None)
    context: Any = getattr(error, "context_mark", None)
    said = f"{getattr(error, 'context', '')} {getattr(error, 'problem', '')}"
    fitting = (row for row in _WORDINGS if row[0] in said)
    row = _TAB if "any token" in said and _character_at(text, place) == "\t" else next(fitting, _OTHER)
    _, at_beginning, sentence, help_text = row
    chosen = context if at_beginning and context is not None else place
    line, column = (chosen.line, chosen.column) if chosen is not None else (0, 0)
    lines = source_lines(text)
    if line >= len(lines):  # the end of a text without a last line end counts as a line for the parser
        line, column = len(lines) - 1, len(lines[-1])
    report(line, column, 1, sentence, help_text)


def _character_at(text: str, place: Any) -> str:
    lines = source_lines(text)
    return lines[place.line][place.column : place.column + 1] if place is not None and place.line < len(lines) else ""
