"""A run without a mission: the real board, gate and control server of a run, with a script in the place of the host.

What reaches it is kept, answered and shown in the next view, as a host would. The screen at its other end uses the real
`RemoteSource`.
"""

from __future__ import annotations

import fcntl
import os
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import cast

from backends.contract import Backend
from runner.host.board import Board, Wish
from runner.host.control import ControlServer
from runner.host.gate import Gate
from runner.host.view import FeedLine, View, Weight
from runner.machine.table import Event
from tests.screen.scripted import ENDED, FEED, HELD, MOVING


class Halting:
    """A robot of which only halts are asked."""

    def __init__(self) -> None:
        self.halts = 0

    def halt(self) -> None:
        self.halts += 1


class Hosted:
    """The host's end. `deaf` keeps it from looking at what is asked."""

    def __init__(self, folder: Path, view: View | None) -> None:
        self.folder, self.robot, self.board = folder, Halting(), Board("host")
        self.server = ControlServer(folder, self.board, Gate(cast(Backend, self.robot)))
        self.received: list[tuple[Event | None, str, str]] = []
        self.deaf = threading.Event()
        self.over = threading.Event()
        for line in FEED:
            self.board.post_line(line)
        self.now = view
        if view is not None:
            self.board.post_view(view)

    def show(self, view: View) -> None:
        """Post a view."""
        self.now = view
        self.board.post_view(view)

    def work(self) -> None:
        """The host's thread: signs of life, and what is asked."""
        while not self.over.wait(0.02):
            if self.deaf.is_set():
                continue
            if self.now is not None:
                self.board.post_view(self.now)
            wish = self.board.next_wish(0.0)
            if wish is not None:
                self._take(wish)

    def _take(self, wish: Wish) -> None:
        self.received.append((wish.event, wish.text, wish.who))
        now = self.now or MOVING
        word = wish.event.value if wish.event else "said"
        self.board.post_line(FeedLine(now.stamp, now.clock, Weight.NOTICE, f"{word} by {wish.who}", who=wish.who))
        replies = {
            Event.HOLD: replace(HELD, pose=now.pose),
            Event.RELEASE: MOVING,
            Event.ABORT: replace(ENDED, outcome="aborted", reason="aborted by operator"),
            Event.ANSWERED: MOVING,
        }
        if wish.event in replies:
            self.show(replies[wish.event])
        wish.answered(wish.event is not Event.SKIP, "no effect now" if wish.event is Event.SKIP else "done")


@contextmanager
def hosted(folder: Path, view: View | None = MOVING) -> Iterator[Hosted]:
    """Host a scripted run in a folder, owned as a run's folder is."""
    folder.mkdir(mode=0o700, parents=True, exist_ok=True)
    handle = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
    fcntl.flock(handle, fcntl.LOCK_EX)
    host = Hosted(folder, view)
    thread = threading.Thread(target=host.work, daemon=True)
    thread.start()
    try:
        with host.server.serving():
            yield host
    finally:
        host.over.set()
        thread.join(2.0)
        os.close(handle)
