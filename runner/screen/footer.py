"""The rows at the bottom: the rule with the legend or a remark, what happened last, and the keys or an open prompt."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from enum import Enum

from runner.host.view import FeedLine, View, Weight
from runner.screen.commands import COMMANDS, Command, means_something
from runner.screen.ink import Glyphs, Ink, Row, crop, cut, flow, row_width, wrap

_WEIGHT_INK = {Weight.PLAIN: Ink.TEXT, Weight.NOTICE: Ink.NOTICE, Weight.TROUBLE: Ink.TROUBLE}


class Mode(Enum):
    """What the keys mean at the moment."""

    WATCHING = "watching"
    ABORTING = "aborting: y to confirm"
    ANSWERING = "answering: a digit chooses"
    READING = "reading the help"
    CHOOSING = "choosing a command"


def rule(width: int, glyphs: Glyphs, with_floor: bool, any_shut: bool, remark: str = "") -> Row:
    """The line above the feed. What was asked for and how far it has come stands on it; else it explains the marks."""
    if remark:
        said = cut(f" {glyphs.say(remark)} ", width - 4, glyphs.more)
        return _ruled((said, Ink.QUESTION), width, glyphs)
    legend = ""
    for mark in _marks(glyphs, any_shut) if with_floor else ():
        if len(legend) + len(mark) + 6 <= width:
            legend += f" {mark} "
    return _ruled((legend, Ink.FAINT), width, glyphs)


def _ruled(middle: tuple[str, Ink], width: int, glyphs: Glyphs) -> Row:
    rest = max(width - 2 - row_width((middle,)), 0)
    return ((glyphs.rule * 2, Ink.FAINT), middle, (glyphs.rule * rest, Ink.FAINT))


def _marks(glyphs: Glyphs, any_shut: bool) -> list[str]:
    """The marks of the floor, the most important first. Doors are shut by their known hours only: no robot tells us."""
    shut = [f"shut by hours {glyphs.shut_across}"] if any_shut else []
    return [
        f"robot {glyphs.heading[0]}",
        f"route {glyphs.route * 2}",
        f"goal {glyphs.goal}",
        f"sensed {glyphs.sensed}",
        f"stuck {glyphs.stuck}",
        *shut,
        f"trail {glyphs.trail}",
        f"door {glyphs.door_across}",
        f"sensed before {glyphs.before}",
        f"place {glyphs.place}",
    ]


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


def answers(question: str, offered: Sequence[str], width: int, height: int, glyphs: Glyphs) -> list[Row]:
    """The open question with the keys of its answers, in the place of the feed."""
    choices = [_key(str(number), cut(glyphs.say(word), 24, glyphs.more)) for number, word in enumerate(offered, 1)]
    below = flow(choices, width, height)
    asked = wrap(glyphs.say(question), max(width - 2, 1), max(height - len(below), 0), glyphs.more)
    return [*(((f" {line}", Ink.STRONG),) for line in asked[: height - len(below)]), *below]


def keys(view: View | None, mode: Mode, read_only: bool, width: int, glyphs: Glyphs) -> Row:
    """The keys that mean something now, or what an open prompt asks for."""
    match mode:
        case Mode.ABORTING:
            return _prompt("Abort the run? The robot halts.", (("y", "abort"), ("Esc", "go on")), width, glyphs)
        case Mode.ANSWERING:
            return _prompt("A digit answers.", (("Esc", "not now"),), width, glyphs)
        case Mode.READING:
            return _prompt("", (("arrows", "more"), ("Esc", "back")), width, glyphs)
        case Mode.CHOOSING:
            return _prompt("", (("arrows", "choose"), ("Enter", "do it"), ("Esc", "back")), width, glyphs)
    return _offer(view, read_only, width, glyphs)


def _offer(view: View | None, read_only: bool, width: int, glyphs: Glyphs) -> Row:
    offered = [command for command in COMMANDS if command.label and means_something(command, view, read_only)]
    lead: Row = ((" only looking ", Ink.FAINT),) if read_only else ()
    for commands in (offered, [command for command in offered if not command.spare]):
        for apart in (True, False):  # closer together where they would be cut
            row = (*lead, *(span for command in commands for span in _cap(command, apart)))
            if row_width(row) <= width:
                return row
    return crop(row, width, glyphs.more)


def _cap(command: Command, apart: bool) -> Row:
    return _key(command.cap, command.label, apart)


def _key(key: str, does: str, apart: bool = True) -> Row:
    gap = " " if apart else ""
    return ((gap, Ink.TEXT), (f" {key} ", Ink.KEY), (f"{gap}{does} ", Ink.TEXT))


def key_at(row: Row, column: int) -> str:
    """The cap of the key whose cap or label is in that column of the row, if any: for a finger or a mouse."""
    at, cap = 0, ""
    for text, ink in row:
        cap = text.strip() if ink is Ink.KEY else cap
        at += row_width(((text, ink),))
        if column < at:
            return cap
    return ""


def _prompt(text: str, offered: Sequence[tuple[str, str]], width: int, glyphs: Glyphs) -> Row:
    choices: Row = tuple(span for key, does in offered for span in _key(key, does))
    room = width - row_width(choices)
    asked = f" {wrap(text, max(room - 1, 1), 1, glyphs.more)[0]}" if text and room > 8 else ""
    return ((asked, Ink.QUESTION), *choices)
