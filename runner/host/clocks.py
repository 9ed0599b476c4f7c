"""Notices that the wall clock was set: by network time, by daylight saving, or while the computer slept.

Durations of a run are of the backend's own clock, which never jumps. Only clock conditions follow the wall.
"""

from __future__ import annotations

from datetime import datetime

from backends.contract import Clock

STEP_S = 1.0
"""A smaller difference is left to add up: network time slews a clock by fractions of a second all night."""
BETWEEN_LOOKS_S = 1.0


def seconds_of_day(wall: datetime) -> float:
    """Seconds since midnight, as the clock on the wall shows them."""
    return wall.hour * 3600.0 + wall.minute * 60.0 + wall.second + wall.microsecond / 1e6


class WallWatch:
    """Compares the wall clock with the run's own."""

    def __init__(self, clock: Clock) -> None:
        self._clock = clock
        self._wall = clock.wall()
        self._now = clock.now()
        self._next_look = self._now + BETWEEN_LOOKS_S

    def moved(self) -> float:
        """By how many seconds the wall clock was set since the last time it was found to be; 0 for not at all."""
        now = self._clock.now()
        if now < self._next_look:
            return 0.0
        self._next_look = now + BETWEEN_LOOKS_S
        wall = self._clock.wall()
        step = (wall - self._wall).total_seconds() - (now - self._now)
        if abs(step) < STEP_S:
            return 0.0
        self._wall, self._now = wall, now
        return step
