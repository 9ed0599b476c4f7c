"""How good the line is, and how far apart the two clocks are, from beats and their echoes.

The offset is that of the exchange with the shortest round trip among the last few: what delays a message only ever
adds, so the shortest exchange is the least wrong, by at most half its round trip (Cristian 1989, "Probabilistic clock
synchronization"; Mills 1991, "Internet time synchronization").
"""

from __future__ import annotations

from collections import deque
from statistics import median

from backends.contract import LineQuality

EXCHANGES_KEPT = 32
BEATS_KEPT = 64


class Line:
    """Collects exchanges. Times in seconds: `sent` and `came` of our clock, `stamp` of the robot's."""

    def __init__(self) -> None:
        self._exchanges: deque[tuple[float, float]] = deque(maxlen=EXCHANGES_KEPT)
        self._beats: deque[float] = deque(maxlen=BEATS_KEPT)
        self._answered: set[float] = set()
        self.offset = 0.0

    def forget_clock(self) -> None:
        """The robot's clock began anew."""
        self._exchanges.clear()

    def beat(self, sent: float) -> None:
        """A beat went out."""
        if len(self._beats) == BEATS_KEPT:
            self._answered.discard(self._beats[0])
        self._beats.append(sent)

    def echo(self, sent: float, stamp: float, came: float) -> None:
        """A beat came back. An echo of nothing we sent, or of the future, is left out."""
        if sent not in self._beats or came < sent:
            return
        self._answered.add(sent)
        self._exchanges.append((came - sent, stamp - (sent + came) / 2.0))
        self.offset = min(self._exchanges)[1]

    def guess(self, stamp: float, now: float) -> None:
        """Before any echo: the offset as if the message had taken no time."""
        if not self._exchanges:
            self.offset = stamp - now

    def quality(self, now: float, grace: float = 1.0) -> LineQuality:
        """The figures now; beats younger than `grace` seconds may still be answered and are not counted yet."""
        old = [sent for sent in self._beats if sent in self._answered or now - sent > grace]
        answered = sum(sent in self._answered for sent in old) / len(old) if old else 1.0
        if not self._exchanges:
            return LineQuality(None, None, self.offset, None, answered)
        trips = [trip for trip, _ in self._exchanges]
        return LineQuality(median(trips), max(trips), self.offset, min(trips) / 2.0, answered)
