"""Where a stall is detected: progress is the fall in remaining route length, not distance moved.

A mark is set when driving begins, and again each time the remaining route has fallen by the rule's distance since the
last mark. If the rule's window passes without a new mark, the leg is stalled. Two things make this honest:
- when the robot plans a new route, the remaining length jumps; the jump is neither progress nor the loss of it, and
  the window goes on. A robot that flips between two routes while it stands still is stalled.
- a robot that shuttles makes marks by driving each of two routes in turn. Swaying is much driving with nothing gained:
  since the remaining route was last at its shortest, the robot has driven farther than the longest route it had since,
  half as much again, and some meters.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from runner.engine.values import Seen
from runner.machine.table import Event, Watch

SWAY_FACTOR = 1.5
SWAY_MARGIN_M = 3.0
"""Our choice: no honest detour costs more than half again its own length plus a few meters of maneuvering."""


@dataclass(frozen=True, slots=True)
class Progress:
    """Registers of the watch. Lengths in meters; `mark` is the remaining length when the last mark was set."""

    mark_stamp: float
    mark: float | None = None
    last: float | None = None
    route_number: int = -1
    best: float = float("inf")
    longest: float = 0.0
    driven_at_best: float = 0.0


def look(progress: Progress, watch: Watch, seen: Seen) -> tuple[Progress, Event | None]:
    """Take in one telemetry: the registers after it, and STALLED, SWAYING, PROGRESSED or nothing."""
    progress = _follow(progress, seen)
    if progress.mark is not None and progress.last is not None and progress.mark - progress.last >= watch.progress:
        return replace(progress, mark_stamp=seen.stamp, mark=progress.last), _swaying(progress, seen, Event.PROGRESSED)
    if seen.stamp - progress.mark_stamp >= watch.window:
        return progress, Event.STALLED
    return progress, _swaying(progress, seen, None)


def _follow(progress: Progress, seen: Seen) -> Progress:
    """Bring the lengths up to date; a jump at a new route moves the mark by the same amount."""
    if seen.remaining is None:
        return progress
    mark = seen.remaining if progress.mark is None or progress.last is None else progress.mark
    if progress.last is not None and seen.route_number != progress.route_number:
        mark += seen.remaining - progress.last
    better = seen.remaining < progress.best
    return replace(
        progress,
        mark=mark,
        last=seen.remaining,
        route_number=seen.route_number,
        best=seen.remaining if better else progress.best,
        longest=seen.remaining if better else max(progress.longest, seen.remaining),
        driven_at_best=seen.driven if better else progress.driven_at_best,
    )


def _swaying(progress: Progress, seen: Seen, otherwise: Event | None) -> Event | None:
    if progress.last is None:
        return otherwise
    driven = seen.driven - progress.driven_at_best
    return Event.SWAYING if driven > SWAY_FACTOR * progress.longest + SWAY_MARGIN_M else otherwise
