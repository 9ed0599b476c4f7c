"""Whether a leg gets on: progress, stalling and swaying, report by report, as LANGUAGE.md tells it."""

from __future__ import annotations

from dataclasses import dataclass
from math import inf

from runner.engine.values import Seen
from runner.language.mission import RetryRule
from runner.machine.table import Event


@dataclass
class Headway:
    """Begins when driving begins. `mark` is the remaining length at the mark, `marked` when progress was last made."""

    rule: RetryRule
    marked: float
    mark: float | None = None
    remaining: float = 0.0
    route: int | None = None
    lowest: float = inf
    longest: float = 0.0
    driven_at_lowest: float = 0.0

    def report(self, seen: Seen) -> Event | None:
        """PROGRESSED, STALLED, SWAYING or None."""
        gets_on = seen.remaining is not None and self._gets_on(seen, seen.remaining)
        if not gets_on and seen.stamp - self.marked >= self.rule.stall_window:
            return Event.STALLED
        if self.mark is not None and seen.driven - self.driven_at_lowest > 1.5 * self.longest + 3.0:
            return Event.SWAYING
        return Event.PROGRESSED if gets_on else None

    def _gets_on(self, seen: Seen, remaining: float) -> bool:
        if self.mark is None:
            self.mark = remaining
        elif seen.route_number != self.route:
            self.mark += remaining - self.remaining
        if remaining < self.lowest:
            self.lowest = self.longest = remaining
            self.driven_at_lowest = seen.driven
        self.longest = max(self.longest, remaining)
        self.remaining, self.route = remaining, seen.route_number
        if self.mark - remaining < self.rule.stall_progress:
            return False
        self.mark, self.marked = remaining, seen.stamp
        return True
