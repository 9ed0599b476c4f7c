"""The estimates as a table for people: 80 columns of plain text."""

from __future__ import annotations

import math
from collections.abc import Iterator
from textwrap import fill

from runner.machine.checks import Estimates, StepLine
from runner.machine.spans import Span
from runner.machine.wording import say_clock, say_roughly

TEXT_WIDTH = 27
WIDTH = 80


def as_text(estimates: Estimates, most_lines: int | None = None) -> str:
    """The whole first, then each step, then what the numbers take for granted."""
    return "\n".join(_lines(estimates, most_lines))


def _lines(estimates: Estimates, most_lines: int | None) -> Iterator[str]:
    yield _row(f"Begun at {say_clock(estimates.begins_clock)}", "begins", "least", "likely", "most", "route")
    yield _row("the whole mission", "", *_times(estimates.seconds), _meters(estimates.meters))
    for step in estimates.steps[:most_lines]:
        yield _step(step, estimates.begins_clock)
    left = 0 if most_lines is None else len(estimates.steps) - most_lines
    if left > 0:
        yield f"... and {left} more steps; --all shows them"
    drawn = estimates.watt_hours
    yield f"Battery: {_watt_hours(drawn.least)} at the least, {_watt_hours(drawn.likely)} likely."
    yield "Steps in a repeat are shown for one lap. Routes are likely lengths."
    yield "Taken for granted:"
    for sentence in estimates.assumptions:
        yield fill(sentence, WIDTH, initial_indent="- ", subsequent_indent="  ")


def _step(step: StepLine, begins: float) -> str:
    begun = say_clock(begins + round(step.begins.likely)) if math.isfinite(step.begins.likely) else "never"
    name = f"{step.line:>4} {'  ' * min(step.depth, 4)}{step.text}"
    return _row(name, begun, *_times(step.seconds), _meters(step.meters) if step.meters.likely else "")


def _row(text: str, begins: str, least: str, likely: str, most: str, route: str) -> str:
    shown = text if len(text) <= TEXT_WIDTH else text[: TEXT_WIDTH - 3] + "..."
    return f"{shown:<{TEXT_WIDTH}} {begins:>8} {least:>11} {likely:>11} {most:>11} {route:>6}".rstrip()


def _times(seconds: Span) -> tuple[str, str, str]:
    return say_roughly(seconds.least), say_roughly(seconds.likely), say_roughly(seconds.most)


def _meters(meters: Span) -> str:
    if math.isinf(meters.likely):
        return "-"
    return f"{meters.likely:.0f} m" if meters.likely < 9_999.5 else f"{meters.likely / 1000.0:.0f} km"


def _watt_hours(energy: float) -> str:
    return "no bound" if math.isinf(energy) else f"{energy:.1f} Wh" if energy < 99.95 else f"{energy:.0f} Wh"
