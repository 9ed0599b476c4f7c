"""How fast virtual time may run. A robot's time needs no pacing; a simulator's jumps unless it is held back."""

from __future__ import annotations

import time

HELD_PACE = 1.0
"""While a person holds the robot, time runs no faster than theirs: nobody holds a robot for a night in a blink."""


CATCH_UP_S = 1.0
"""A host that was kept from working longer than this does not run faster to make up for it."""


class Pacer:
    """Compares virtual time with wall time. `pace` is virtual seconds per wall second, None for no bound."""

    def __init__(self, pace: float | None, now: float, held_pace: float | None = HELD_PACE) -> None:
        self._asked = pace
        self._held_pace = held_pace
        self._pace = pace
        self._wall = time.monotonic()
        self._virtual = now

    @property
    def pace(self) -> float | None:
        """The pace in force."""
        return self._pace

    def hold(self, held: bool, now: float) -> None:
        """Slow down while a person holds the robot, and go back to the pace asked for afterwards."""
        pace = self._held_pace if held else self._asked
        if pace != self._pace:
            self._pace, self._wall, self._virtual = pace, time.monotonic(), now

    def ahead(self, now: float) -> float:
        """Wall seconds to wait until wall time has caught up with the virtual time `now`; 0 or less for none."""
        if self._pace is None:
            return 0.0
        ahead = (now - self._virtual) / self._pace - (time.monotonic() - self._wall)
        if ahead < -CATCH_UP_S:
            self._wall, self._virtual = time.monotonic(), now
        return ahead
