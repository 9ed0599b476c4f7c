"""The three rows on top, from which a person two meters away sees how the run is, where, and whether to act."""

from __future__ import annotations

from collections.abc import Iterable

from runner.host.view import FeedLine, Health, View
from runner.screen.ink import HEALTH_INK, Glyphs, Ink, Row, both_ends, faded, row_width, wrap
from runner.screen.showing import Showing
from runner.screen.words import BROKEN_OFF, advice_for, amount, ends_about, legs_so_far, line_so_far, spell_seconds

_SPACED_FROM = 72
"""Columns from which the word of health is spaced out to be read from farther away."""
_UNSURE_M = 0.3
"""From this spread on, how well the robot knows its place is among the figures."""
_MOVES_MPS = 0.05
_IDLE = (Health.STARTING, Health.MOVING, Health.WAITING, Health.RECOVERING)
"""Where a person has nothing to do; to say so is not worth cutting the reason for."""

BEFORE = View(0.0, "--:--:--", Health.STARTING, "making ready")
"""What is shown before the first view."""


def header(view: View | None, showing: Showing, width: int, glyphs: Glyphs, held_by: str = "") -> tuple[Row, Row, Row]:
    """Health, reason and figures. A reason too long for its row takes that of the figures as well; so does what there
    is to do, where it has no room beside the reason.

    `held_by` says who holds the robot, where a person does.
    """
    seen = view or BEFORE
    ink = HEALTH_INK[seen.health]
    top = f"{spaced(seen.health.value, width)}   {_where(seen, glyphs)}"
    health = both_ends(((f" {top}", ink),), ((f"{seen.clock} ", ink),), width, ink, glyphs.more)
    reason = held_by if held_by and seen.health is Health.HELD else seen.reason
    lines = wrap(glyphs.say(reason), max(width - 2, 1), 2, glyphs.more)
    advice: Row = ((f"{_advice(seen, showing, glyphs)} ", ink),)
    whole = len(lines[-1]) + 2 + row_width(advice) <= width
    numbers = figures(seen, showing, width, glyphs)
    if len(lines) == 1 and (whole or seen.health in _IDLE):
        return health, both_ends(((f" {lines[0]}", ink),), advice if whole else (), width, ink, glyphs.more), numbers
    if len(lines) == 1 and seen.health is not Health.ENDED:
        room = width - row_width(advice) - 2
        numbers = both_ends(figures(seen, showing, room, glyphs), advice, width, ink, glyphs.more)
        return health, both_ends(((f" {lines[0]}", ink),), (), width, ink, glyphs.more), numbers
    rest: Row = ((f" {' '.join(lines[1:])}", ink),)
    first = both_ends(((f" {lines[0]}", ink),), (), width, ink, glyphs.more)
    return health, first, both_ends(rest, advice, width, ink, glyphs.more)


def lost_header(view: View, age: float, showing: Showing, width: int, glyphs: Glyphs) -> tuple[Row, Row, Row]:
    """The same where nothing has been heard for `age` seconds: since when, what was last known, and that it tries."""
    ink = Ink.LOST
    since = f"{spaced('no news', width)}   for {spell_seconds(age)}, since {view.clock}"
    top = both_ends(((f" {since}", ink),), (), width, ink, glyphs.more)
    was = f" then {view.health.value}: {glyphs.say(view.reason)}"
    second = both_ends(((was, ink),), (("keeps trying ", ink),), width, ink, glyphs.more)
    old = f"at {view.clock}: "
    known = figures(view, showing, width - len(old), glyphs)
    third: Row = ((f" {old}".rstrip(), Ink.OLD), *faded(known))
    return top, second, both_ends(third, (), width, Ink.OLD, glyphs.more)


def held_by(view: View | None, lines: Iterable[FeedLine]) -> str:
    """Who did what last, where that is what the run stands by."""
    if view is None or view.health is not Health.HELD:
        return ""
    return next((line.text for line in reversed(list(lines)) if line.who), "")


def spaced(word: str, width: int) -> str:
    """A word of health, as large as there is room for."""
    return "  ".join(" ".join(part) for part in word.upper().split()) if width >= _SPACED_FROM else word.upper()


def _where(view: View, glyphs: Glyphs) -> str:
    if view.outcome is not None:
        return glyphs.say(view.outcome)
    if view.place is None:
        return ""
    left = f", {amount(view.remaining, 'm')} to go" if view.remaining is not None else ""
    return f"to {glyphs.say(view.place)}{left}"


def _advice(view: View, showing: Showing, glyphs: Glyphs) -> str:
    if view.health is not Health.ENDED:
        return advice_for(view)
    return glyphs.say(showing.pick_up_hint if view.outcome == BROKEN_OFF else showing.report_hint)


def figures(view: View, showing: Showing, width: int, glyphs: Glyphs) -> Row:
    """As many figures as fit, the most important first, and last the name of the run."""
    moves = abs(view.speed) > _MOVES_MPS
    quick, lost, apart = line_so_far(view)
    parts = [
        legs_so_far(view),
        f"moved at {abs(view.speed):.1f} m/s" if view.outcome is not None and moves else "",
        ends_about(view),
        f"place known to {view.spread:.1f} m" if view.spread is not None and view.spread >= _UNSURE_M else "",
        lost,
        f"battery {view.battery * 100:.0f} %" if view.battery is not None else "",
        quick,
        f"run {spell_seconds(view.stamp)}",
        f"{abs(view.speed):.1f} m/s" if view.pose is not None and view.outcome is None else "",
        apart,
    ]
    parts = [part for part in parts if part]
    while len(parts) > 1 and len("   ".join(parts)) + 1 > width:
        parts.pop()
    left: Row = ((" " + "   ".join(parts), Ink.TEXT),)
    right: Row = ((f"{glyphs.say(showing.run)} ", Ink.FAINT),)
    fits = row_width(left) + row_width(right) + 3 <= width
    return both_ends(left, right if fits else (), width, Ink.TEXT, glyphs.more)
