"""Where the thread that owns a run and those that watch it meet. Neither ever waits for the other.

The host posts views and feed lines; screens take them when they like. A person's wishes go the other way, and each is
answered once, when the engine has had it.
"""

from __future__ import annotations

import queue
import threading
import time
from collections import deque
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from runner.host.view import FeedLine, View
from runner.machine.table import Event

FEED_LINES_MOST = 5_000
"""Lines kept for screens that do not fetch them; older ones are in the journal all the same."""
WISHES_MOST = 1_000
"""Wishes that wait for the host, and aborts. More than that is a flood."""


def _unheard(_accepted: bool, _sentence: str) -> None:
    """For wishes whose answer nobody waits for: the feed says what came of them."""


@dataclass(frozen=True, slots=True)
class Wish:
    """What a person asks for, and who it is. Without an event it is a remark for the record, in `text`.

    `answered` is told, in the host's thread, whether the wish was taken, and in a sentence what came of it.
    """

    event: Event | None
    who: str
    text: str = ""
    answered: Callable[[bool, str], None] = _unheard


class Board:
    """One run's meeting point, safe to use from any thread and from signal handlers (`wish`)."""

    def __init__(self, who: str) -> None:
        self._who = who
        self._view: View | None = None
        self._posted_at = time.monotonic()
        self._feed: deque[FeedLine] = deque(maxlen=FEED_LINES_MOST)
        self._count = 0
        self._taken = 0
        self._lock = threading.Lock()
        self._wishes: queue.SimpleQueue[Wish | None] = queue.SimpleQueue()
        self._aborts: queue.SimpleQueue[Wish] = queue.SimpleQueue()

    # --- for those who watch

    def view(self) -> View | None:
        """The latest view, None before the first."""
        return self._view

    def view_age(self) -> float:
        """Wall seconds since the host last posted a view: the last sign of its life."""
        return time.monotonic() - self._posted_at

    def feed(self) -> Sequence[FeedLine]:
        """Lines that are new since the last call, oldest first. For the one screen in this process."""
        lines, self._taken = self.lines_after(self._taken, FEED_LINES_MOST)
        return lines

    def lines_after(self, number: int, most: int) -> tuple[list[FeedLine], int]:
        """The newest lines after the `number`th, at most so many, and the number of the last of them."""
        with self._lock:
            new = min(self._count - number, len(self._feed), most)
            return (list(self._feed)[-new:] if new > 0 else []), self._count

    def act(self, event: Event) -> None:
        """Pass on a wish of the person at this screen."""
        self.wish(event, self._who)

    def wish(self, event: Event, who: str) -> None:
        """Pass on a wish of that person."""
        self._put(Wish(event, who))

    def post_wish(self, wish: Wish) -> bool:
        """Pass on a wish that wants an answer. False, and nothing happens, where too many are waiting already."""
        waiting = self._aborts if wish.event is Event.ABORT else self._wishes
        if waiting.qsize() >= WISHES_MOST:
            return False
        self._put(wish)
        return True

    def _put(self, wish: Wish) -> None:
        """An abort goes before all that waits; what is put in the queue for it only wakes the host."""
        if wish.event is Event.ABORT:
            self._aborts.put(wish)
        self._wishes.put(None if wish.event is Event.ABORT else wish)

    # --- for the host

    def post_view(self, view: View) -> None:
        self._view = view
        self._posted_at = time.monotonic()

    def post_line(self, line: FeedLine) -> None:
        with self._lock:
            self._feed.append(line)
            self._count += 1

    def next_wish(self, seconds: float) -> Wish | None:
        """The next wish, an abort before any other, waiting for one up to so many seconds of wall time."""
        while True:
            try:
                if not self._aborts.empty():
                    return self._aborts.get_nowait()
                wish = self._wishes.get(timeout=seconds) if seconds > 0.0 else self._wishes.get_nowait()
            except queue.Empty:
                return None
            if wish is not None:
                return wish
