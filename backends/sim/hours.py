"""Hours of the day: when something holds."""

from __future__ import annotations

from collections.abc import Sequence

from runner.site.values import AboutShare


def within(spans: Sequence[tuple[float, float]], clock: float) -> bool:
    """Whether a time of day, in seconds, lies in any of the daily spans; no spans mean always."""
    return not spans or any(_holds(start, end, clock) for start, end in spans)


def share_at(shares: Sequence[AboutShare], clock: float) -> float:
    """The share of people about at a time of day: of the first span that it lies in, else all."""
    return next((one.share for one in shares if _holds(one.start, one.end, clock)), 1.0)


def _holds(start: float, end: float, clock: float) -> bool:
    """A span may run over midnight."""
    return start <= clock < end if start <= end else clock >= start or clock < end
