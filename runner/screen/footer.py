"""The rows at the bottom: the rule with the legend, what happened last, and the keys or the question that is open."""

from __future__ import annotations

from collections.abc import Iterable
from enum import Enum

from runner.host.view import FeedLine, Health, View, Weight
from runner.screen.ink import Glyphs, Ink, Row, crop, row_width, wrap

_WEIGHT_INK = {Weight.PLAIN: Ink.TEXT, Weight.NOTICE: Ink.NOTICE, Weight.TROUBLE: Ink.TROUBLE}


class Question(Enum):
    """What may have to be confirmed: the question, what y does, what Esc does."""

    ABORT = ("Abort the run? The robot halts.", "abort", "go on")
    LEAVE = ("The run is still under way.", "abort and leave", "stay")
    LEAVE_ANYWAY = ("The abort has not come through yet.", "leave all the same", "stay")


def rule(width: int, glyphs: Glyphs, with_floor: bool) -> Row:
    """The line above the feed; it explains the marks on the floor."""
    marks = (
        f" robot {glyphs.heading[0]}  route {glyphs.route * 2}  goal {glyphs.goal}  place {glyphs.place}"
        f"  door {glyphs.door_across}  sensed {glyphs.sensed} "
    )
    legend = marks if with_floor and len(marks) + 4 <= width else ""
    return ((glyphs.rule * 2 + legend, Ink.FAINT), (glyphs.rule * (width - 2 - len(legend)), Ink.FAINT))


def feed(lines: Iterable[FeedLine], width: int, height: int, glyphs: Glyphs) -> list[Row]:
    """The newest lines that fit, newest at the bottom; long ones go on below their beginning."""
    rows: list[Row] = []
    for line in reversed(list(lines)):
        if len(rows) >= height:
            break
        rows = [*_entry(line, width, min(height - len(rows), 3), glyphs), *rows]
    return rows


def _entry(line: FeedLine, width: int, most: int, glyphs: Glyphs) -> list[Row]:
    mark = {Weight.PLAIN: " ", Weight.NOTICE: glyphs.notice, Weight.TROUBLE: glyphs.trouble}[line.weight]
    ink = _WEIGHT_INK[line.weight]
    lead = f" {line.clock} {mark} "
    texts = wrap(glyphs.say(line.text), max(width - len(lead), 1), most, glyphs.more)
    first: Row = ((f" {line.clock} ", Ink.FAINT), (f"{mark} {texts[0]}", ink))
    return [first, *(((" " * len(lead) + text, ink),) for text in texts[1:])]


def keys(view: View | None, question: Question | None, width: int, glyphs: Glyphs) -> Row:
    """The keys that mean something now; or the open question with its two answers."""
    if question is not None:
        return _question(question, width, glyphs)
    offered = _offered(view)
    for apart in (True, False):  # closer together where they would be cut
        row = tuple(span for key, does in offered for span in _key(key, does, apart))
        if row_width(row) <= width:
            break
    return crop(row, width, glyphs.more)


def _offered(view: View | None) -> list[tuple[str, str]]:
    if view is not None and view.health is Health.ENDED:
        return [("q", "leave")]
    first = ("r", "release") if view is not None and view.health is Health.HELD else ("h", "hold")
    return [first, ("s", "skip"), ("a", "abort"), ("q", "leave")]


def _key(key: str, does: str, apart: bool = True) -> Row:
    gap = " " if apart else ""
    return ((gap, Ink.TEXT), (f" {key} ", Ink.KEY), (f"{gap}{does} ", Ink.TEXT))


def _question(question: Question, width: int, glyphs: Glyphs) -> Row:
    text, yes, no = question.value
    answers: Row = (*_key("y", yes), *_key("Esc", no))
    room = width - row_width(answers)
    asked = wrap(text, max(room - 1, 1), 1, glyphs.more)[0] if room > 8 else ""
    return ((f" {asked}", Ink.QUESTION), *answers)
