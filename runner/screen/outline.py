"""The mission as an outline with the step under way marked, and how that step stands against its limits."""

from __future__ import annotations

from collections.abc import Sequence

from runner.host.view import View
from runner.machine.table import StepNote
from runner.screen.ink import Glyphs, Ink, Row, cut, wrap
from runner.screen.words import laps, spell_seconds

_MARK = 2
"""Cells in front of a step, for the mark of the current one."""


def outline(steps: Sequence[StepNote], view: View | None, width: int, height: int, glyphs: Glyphs) -> list[Row]:
    """At most `height` rows around the current step, which is always among them, with its details right below."""
    current = view.step if view is not None else None
    block = _current_block(steps[current], view, width, glyphs) if view is not None and current is not None else []
    above = steps[:current] if current is not None else ()
    below = steps[current + 1 :] if current is not None else steps
    room = max(height - len(block), 0)
    before = min(len(above), max(room // 3, room - len(below)))
    after = min(len(below), room - before)
    rows = [
        *(_step(note, width, glyphs) for note in above[len(above) - before :]),
        *block[:height],
        *(_step(note, width, glyphs) for note in below[:after]),
    ]
    return _count_the_rest(rows, len(above) - before, len(below) - after, glyphs)


def _count_the_rest(rows: list[Row], above: int, below: int, glyphs: Glyphs) -> list[Row]:
    """Say how many steps are out of sight, in place of the outermost ones."""
    if above and len(rows) > 3 and rows[0][0][1] is Ink.TEXT:
        rows[0] = ((f"  {glyphs.more} {above + 1} more above", Ink.FAINT),)
    if below and len(rows) > 3 and rows[-1][0][1] is Ink.TEXT:
        rows[-1] = ((f"  {glyphs.more} {below + 1} more below", Ink.FAINT),)
    return rows


def _indent(note: StepNote, width: int) -> int:
    return min(note.depth * 2, width // 4)


def _step(note: StepNote, width: int, glyphs: Glyphs) -> Row:
    text = " " * (_MARK + _indent(note, width)) + glyphs.say(note.text)
    return ((cut(text, width, glyphs.more), Ink.TEXT),)


def _current_block(note: StepNote, view: View, width: int, glyphs: Glyphs) -> list[Row]:
    indent = _indent(note, width)
    lines = wrap(glyphs.say(note.text), width - _MARK - indent, 2, glyphs.more)
    lead = f"{glyphs.current} " + " " * indent
    steps: list[Row] = [
        ((f"{lead if number == 0 else ' ' * len(lead)}{line}".ljust(width), Ink.CURRENT),)
        for number, line in enumerate(lines)
    ]
    margin = " " * (_MARK + min(indent, 2))
    told = (glyphs.say(line) for line in _details(view, width - len(margin)))
    details = [((cut(margin + line, width, glyphs.more), Ink.STRONG),) for line in told]
    return [*steps, *details, *_time_bar(view, margin, width, glyphs), *_to_come(view, margin, width, glyphs)]


def _details(view: View, width: int) -> list[str]:
    """Laps, tries and recoveries, as far as there is anything to say, on as few lines as they fit."""
    counts = [laps(view)] if view.laps else []
    if view.tries_at_most:
        counts.append(f"try {view.tries} of {view.tries_at_most}")
    joined = ", ".join(counts)
    lines = ([joined] if len(joined) <= width else counts) if counts else []
    if view.recoveries:
        most = f" of {view.recoveries_at_most}" if view.recoveries_at_most else ""
        lines.append(f"recovery {view.recoveries}{most}")
    if view.order is not None:
        lines.append(f"standing order: {view.order}")
    return lines


def _to_come(view: View, margin: str, width: int, glyphs: Glyphs) -> list[Row]:
    """Where a visit goes after this, which the order of the steps need not show."""
    if not view.to_visit:
        return []
    text = glyphs.say(f"then {', '.join(view.to_visit)}")
    return [((margin + line, Ink.STRONG),) for line in wrap(text, width - len(margin), 2, glyphs.more)]


def _time_bar(view: View, margin: str, width: int, glyphs: Glyphs) -> list[Row]:
    if view.leg_seconds is None:
        return []
    if view.leg_limit is None:
        return [((cut(f"{margin}{spell_seconds(view.leg_seconds)} so far", width, glyphs.more), Ink.STRONG),)]
    text = f"{margin}{spell_seconds(view.leg_seconds)} of {spell_seconds(view.leg_limit)} "
    length = min(width - len(text) - 1, 20)
    share = min(view.leg_seconds / view.leg_limit, 1.0) if view.leg_limit > 0 else 1.0
    done = round(share * length)
    if length < 4:
        return [((cut(text, width, glyphs.more), Ink.STRONG),)]
    late = Ink.NOTICE if share > 0.8 else Ink.STRONG
    return [((text, Ink.STRONG), (glyphs.done * done, late), (glyphs.ahead * (length - done), Ink.FAINT))]


def summary(view: View, report_hint: str, width: int, glyphs: Glyphs) -> list[Row]:
    """What stands beside the floor once the run has ended: how, the first numbers, and how to see the record."""
    figures = [
        ("legs arrived", str(view.legs_arrived)),
        ("legs failed", str(view.legs_failed)),
        ("incidents", str(view.incidents)),
        ("time", spell_seconds(view.stamp)),
    ]
    if view.battery is not None:
        figures.append(("battery left", f"{view.battery * 100:.0f} %"))
    ended = wrap(glyphs.say(view.outcome or "ended"), width, 3, glyphs.more)
    hint = wrap(glyphs.say(report_hint), width - 2, 4, glyphs.more)
    return [
        (("has ended:", Ink.FAINT),),
        *(((line, Ink.TEXT),) for line in ended),
        (),
        *(((f"{name:<14}{value:>8}", Ink.TEXT),) for name, value in figures),
        (),
        (("See the record with", Ink.FAINT),),
        *(((f"  {line}", Ink.STRONG),) for line in hint),
    ]
