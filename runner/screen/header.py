"""The three rows on top, from which a person two meters away sees how the run is, where, and whether to act."""

from __future__ import annotations

from runner.host.view import Health, View
from runner.screen.ink import HEALTH_INK, Glyphs, Ink, Row, both_ends, row_width
from runner.screen.terminal import clean
from runner.screen.words import NEXT_FOR_YOU, amount, legs_so_far, spell_seconds

_SPACED_FROM = 72
"""Columns from which the word of health is spaced out to be read from farther away."""

_BEFORE = View(0.0, "--:--:--", Health.STARTING, "making ready")


def header(view: View | None, name: str, width: int, glyphs: Glyphs, remark: str) -> tuple[Row, Row, Row]:
    """Health, reason and figures. `name` is the mission's; `remark`, where not empty, stands where it says what you
    have to do."""
    seen = view or _BEFORE
    ink = HEALTH_INK[seen.health]
    return (
        both_ends(_health(seen, ink, width), ((f"{seen.clock} ", ink),), width, ink, glyphs.more),
        _reason(seen, ink, width, glyphs, remark),
        _figures(seen, name, width, glyphs),
    )


def _health(view: View, ink: Ink, width: int) -> Row:
    word = view.health.value.upper()
    shown = " ".join(word) if width >= _SPACED_FROM else word
    return ((f" {shown}   {_where(view)}", ink),)


def _where(view: View) -> str:
    if view.outcome is not None:
        return clean(view.outcome)
    if view.place is None:
        return ""
    left = f", {amount(view.remaining, 'm')} to go" if view.remaining is not None else ""
    return f"to {clean(view.place)}{left}"


def _reason(view: View, ink: Ink, width: int, glyphs: Glyphs, remark: str) -> Row:
    """The reason comes first; advice that would cut it is left away where the word of health says it already."""
    reason: Row = ((f" {clean(view.reason)}", ink),)
    advice: Row = ((f"{remark or NEXT_FOR_YOU[view.health]} ", ink),)
    if row_width(reason) + row_width(advice) + 1 > width and not remark and view.health is not Health.HELD:
        advice = ()
    return both_ends(reason, advice, width, ink, glyphs.more)


def _figures(view: View, name: str, width: int, glyphs: Glyphs) -> Row:
    parts = [legs_so_far(view), f"run {spell_seconds(view.stamp)}"]
    if view.battery is not None:
        parts.append(f"battery {view.battery * 100:.0f} %")
    if view.pose is not None:
        parts.append(f"{abs(view.speed):.1f} m/s")
    left = " " + "   ".join(parts)
    return both_ends(((left, Ink.TEXT),), ((f"{clean(name)} ", Ink.FAINT),), width, Ink.TEXT, glyphs.more)
