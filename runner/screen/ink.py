"""What the screen's text is made of: spans of text, each with an ink that says what it means; and the marks used.

An ink is a meaning, not a color; `runner.screen.painted` gives it a look. Every meaning also has its own mark or word,
so that a screen without color says the same.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from enum import Enum

from rich.cells import cell_len, chop_cells, set_cell_size

from runner.host.view import Health
from runner.screen.terminal import clean, to_ascii


class Ink(Enum):
    """What a piece of text means."""

    TEXT = "text"
    FAINT = "faint"
    STRONG = "strong"
    CURRENT = "current step"
    NOTICE = "notice"
    TROUBLE = "trouble"
    KEY = "key"
    QUESTION = "question"
    WALL = "wall"
    FURNITURE = "furniture"
    DOOR = "door"
    PLACE = "place"
    GOAL = "goal"
    ROUTE = "route"
    SENSED = "sensed"
    ROBOT = "robot"
    TRAIL = "trail"
    BEFORE = "told of before"
    SPREAD = "spread"
    STUCK = "stuck here"
    SHUT = "shut by its hours"
    OLD = "old"
    LOST = "no news"
    STARTING = "starting"
    MOVING = "moving"
    WAITING = "waiting"
    RECOVERING = "recovering"
    HELD = "held"
    NEEDS_YOU = "needs you"
    ENDED = "ended"


HEALTH_INK: dict[Health, Ink] = {health: Ink(health.value) for health in Health}

Span = tuple[str, Ink]
Row = tuple[Span, ...]


@dataclass(frozen=True, slots=True)
class Glyphs:
    """The marks of one alphabet, each one cell wide. `heading` runs counterclockwise from +x in equal sectors."""

    dots: bool
    heading: str
    place: str
    goal: str
    sensed: str
    furniture: str
    door_across: str
    door_upright: str
    shut_across: str
    shut_upright: str
    trail: str
    before: str
    stuck: str
    outline: str
    old_robot: str
    route: str
    current: str
    more: str
    done: str
    ahead: str
    rule: str
    upright: str
    trouble: str
    notice: str

    def say(self, text: str) -> str:
        """A text from outside, made safe and put into this alphabet."""
        return clean(text) if self.dots else to_ascii(clean(text))


DOTTED = Glyphs(
    dots=True,
    heading="→↗↑↖←↙↓↘",
    place="◦",
    goal="●",
    sensed="\u00d7",  # a multiplication sign
    furniture="⢕",
    door_across="╌",
    door_upright="┆",
    shut_across="▬",
    shut_upright="▮",
    trail="⠂",
    before="∘",
    stuck="!",
    outline="⣿",
    old_robot="?",
    route="⠒",
    current="▶",
    more="…",
    done="━",
    ahead="╌",
    rule="─",
    upright="│",
    trouble="!",
    notice="•",
)
ASCII = Glyphs(
    dots=False,
    heading=">^<v",
    place="o",
    goal="@",
    sensed="x",
    furniture="%",
    door_across="~",
    door_upright=":",
    shut_across="=",
    shut_upright="H",
    trail=",",
    before="c",
    stuck="!",
    outline="*",
    old_robot="?",
    route=".",
    current=">",
    more="~",
    done="=",
    ahead=".",
    rule="-",
    upright="|",
    trouble="!",
    notice="*",
)


def cut(text: str, width: int, more: str) -> str:
    """The text if it fits into that many cells, else its beginning and the mark for more."""
    if cell_len(text) <= width:
        return text
    return "" if width <= 0 else set_cell_size(text, width - 1).rstrip() + more


def wrap(text: str, width: int, lines: int, more: str) -> list[str]:
    """The text in at most that many lines, broken between words where possible; the last one cut if need be."""
    wrapped: list[str] = []
    rest = text
    while rest and len(wrapped) < lines - 1 and cell_len(rest) > width > 0:
        head = chop_cells(rest, width)[0]
        space = head.rfind(" ") if not rest[len(head) :].startswith(" ") else len(head)
        end = space if space > width // 3 else len(head)
        wrapped.append(rest[:end].rstrip())
        rest = rest[end:].lstrip()
    return [*wrapped, cut(rest, width, more)] if rest or not wrapped else wrapped


def row_width(row: Row) -> int:
    """Cells a row takes."""
    return sum(cell_len(text) for text, _ in row)


def both_ends(left: Row, right: Row, width: int, ink: Ink, more: str) -> Row:
    """A row with one part at each end, exactly `width` cells. Where both do not fit, the left is cut, or the right is
    dropped if it would leave less than half of the width."""
    both = row_width(left) + row_width(right) + 1
    if both > width and row_width(right) + 1 > width // 2:
        right = ()
    room = width - row_width(right) - (1 if right else 0)
    kept = crop(left, room, more)
    return (*kept, (" " * (width - row_width(kept) - row_width(right)), ink), *right)


def flow(items: Iterable[Row], width: int, height: int) -> list[Row]:
    """Rows side by side, as many on a line as fit, on at most that many lines."""
    lines: list[Row] = [()]
    for item in items:
        if lines[-1] and row_width(lines[-1]) + row_width(item) > width:
            lines.append(())
        lines[-1] = (*lines[-1], *item)
    return lines[:height]


def faded(row: Row) -> Row:
    """The same text, as old news."""
    return tuple((text, Ink.OLD) for text, _ in row)


def crop(row: Row, width: int, more: str) -> Row:
    """The row cut to at most that many cells."""
    kept: list[Span] = []
    for text, ink in row:
        room = width - row_width(tuple(kept))
        kept.append((cut(text, room, more), ink))
        if cell_len(text) > room:
            break
    return tuple(span for span in kept if span[0])
