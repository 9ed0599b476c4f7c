"""The three rows on top, from which a person two meters away sees how the run is, where, and whether to act."""

from __future__ import annotations

from runner.host.view import Health, View
from runner.screen.ink import HEALTH_INK, Glyphs, Ink, Row, both_ends, row_width, wrap
from runner.screen.showing import Showing
from runner.screen.words import NEXT_FOR_YOU, amount, legs_so_far, spell_seconds

_SPACED_FROM = 72
"""Columns from which the word of health is spaced out to be read from farther away."""

BEFORE = View(0.0, "--:--:--", Health.STARTING, "making ready")
"""What is shown before the first view."""


def header(view: View | None, showing: Showing, width: int, glyphs: Glyphs, remark: str) -> tuple[Row, Row, Row]:
    """Health, reason and figures. A reason too long for its row takes that of the figures as well; so does, at the end,
    the command that shows the record.

    `remark`, where not empty, stands in the place of what there is to do.
    """
    seen = view or BEFORE
    ink = HEALTH_INK[seen.health]
    health = both_ends(_health(seen, ink, width, glyphs), ((f"{seen.clock} ", ink),), width, ink, glyphs.more)
    lines = wrap(glyphs.say(seen.reason), max(width - 2, 1), 2, glyphs.more)
    advice: Row = ((f"{remark or _advice(seen, showing, glyphs)} ", ink),)
    whole = len(lines[-1]) + 2 + row_width(advice) <= width
    if len(lines) == 1 and (whole or seen.health is not Health.ENDED):
        return health, _reason(lines[0], advice, seen, ink, width, glyphs), _figures(seen, showing, width, glyphs)
    rest: Row = ((f" {' '.join(lines[1:])}", ink),)
    first = both_ends(((f" {lines[0]}", ink),), (), width, ink, glyphs.more)
    return health, first, both_ends(rest, advice, width, ink, glyphs.more)


def _health(view: View, ink: Ink, width: int, glyphs: Glyphs) -> Row:
    word = view.health.value.upper()
    shown = " ".join(word) if width >= _SPACED_FROM else word
    return ((f" {shown}   {_where(view, glyphs)}", ink),)


def _where(view: View, glyphs: Glyphs) -> str:
    if view.outcome is not None:
        return glyphs.say(view.outcome)
    if view.place is None:
        return ""
    left = f", {amount(view.remaining, 'm')} to go" if view.remaining is not None else ""
    return f"to {glyphs.say(view.place)}{left}"


def _advice(view: View, showing: Showing, glyphs: Glyphs) -> str:
    return glyphs.say(showing.report_hint) if view.health is Health.ENDED else NEXT_FOR_YOU[view.health]


def _reason(line: str, advice: Row, view: View, ink: Ink, width: int, glyphs: Glyphs) -> Row:
    """The reason comes first; that nothing is to be done is left away where it would cut the reason."""
    reason: Row = ((f" {line}", ink),)
    tight = row_width(reason) + row_width(advice) + 1 > width
    idle = NEXT_FOR_YOU[view.health] + " " == advice[0][0] and view.health is not Health.HELD
    return both_ends(reason, () if tight and idle else advice, width, ink, glyphs.more)


def _figures(view: View, showing: Showing, width: int, glyphs: Glyphs) -> Row:
    """As many figures as fit, the most important first, and last the name of the run."""
    parts = [legs_so_far(view), f"run {spell_seconds(view.stamp)}"]
    if view.battery is not None:
        parts.append(f"battery {view.battery * 100:.0f} %")
    if view.pose is not None and view.outcome is None:
        parts.append(f"{abs(view.speed):.1f} m/s")
    while len(parts) > 1 and len("   ".join(parts)) + 1 > width:
        parts.pop()
    left: Row = ((" " + "   ".join(parts), Ink.TEXT),)
    right: Row = ((f"{glyphs.say(showing.run)} ", Ink.FAINT),)
    fits = row_width(left) + row_width(right) + 3 <= width
    return both_ends(left, right if fits else (), width, Ink.TEXT, glyphs.more)
