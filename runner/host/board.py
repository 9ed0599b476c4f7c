"""Where the thread that owns a run and those that watch it meet. Neither ever waits for the other.

The host posts views and feed lines; a screen takes them when it likes. A person's wishes go the other way.
"""

from __future__ import annotations

import queue
import threading
from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass

from runner.host.view import FeedLine, View
from runner.machine.table import Event

FEED_LINES_MOST = 5_000
"""Lines kept for a screen that does not fetch them; older ones are in the journal all the same."""


@dataclass(frozen=True, slots=True)
class Wish:
    """What a person asks for: HOLD, RELEASE, SKIP or ABORT, and who it is."""

    event: Event
    who: str


class Board:
    """One run's meeting point, safe to use from any thread and from signal handlers (`wish`)."""

    def __init__(self, who: str) -> None:
        self._who = who
        self._view: View | None = None
        self._feed: deque[FeedLine] = deque(maxlen=FEED_LINES_MOST)
        self._lock = threading.Lock()
        self._wishes: queue.SimpleQueue[Wish] = queue.SimpleQueue()

    # --- for those who watch

    def view(self) -> View | None:
        """The latest view, None before the first."""
        return self._view

    def feed(self) -> Sequence[FeedLine]:
        """Lines that are new since the last call, oldest first."""
        with self._lock:
            lines = list(self._feed)
            self._feed.clear()
        return lines

    def act(self, event: Event) -> None:
        """Pass on a wish of the person at this screen."""
        self.wish(event, self._who)

    def wish(self, event: Event, who: str) -> None:
        """Pass on a wish of that person."""
        self._wishes.put(Wish(event, who))

    # --- for the host

    def post_view(self, view: View) -> None:
        self._view = view

    def post_line(self, line: FeedLine) -> None:
        with self._lock:
            self._feed.append(line)

    def next_wish(self, seconds: float) -> Wish | None:
        """The next wish, waiting for one up to so many seconds of wall time."""
        try:
            return self._wishes.get(timeout=seconds) if seconds > 0.0 else self._wishes.get_nowait()
        except queue.Empty:
            return None
