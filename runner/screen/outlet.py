"""Output that never keeps a run waiting: a terminal that was stopped with Ctrl-S, or a pager that nobody reads on.

A run in plain lines lives in the process that prints them. A write to a terminal or a pipe that takes nothing more
blocks, and the robot would be left without its controller. So lines are handed to a thread that may block instead.
"""

from __future__ import annotations

import os
import queue
import threading
import time
from math import inf
from typing import TextIO

LINES_MOST = 100_000
"""Lines that wait for a reader, some ten megabytes. More are dropped; the record has them all."""


class Outlet:
    """A stream whose `write` returns at once. BrokenPipeError from `write` once the reader is found to be gone."""

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream
        self._waiting: queue.SimpleQueue[str | None] = queue.SimpleQueue()
        self._gone = self._closing = False
        self._thread = threading.Thread(target=self._pass_on, name="output", daemon=True)
        self._thread.start()

    def write(self, text: str) -> None:
        if self._gone:
            raise BrokenPipeError
        if self._waiting.qsize() < LINES_MOST:
            self._waiting.put(text)

    def flush(self) -> None:
        """Nothing to do: each line is flushed as it goes out."""

    def fileno(self) -> int:
        return self._stream.fileno()

    def close(self, seconds: float | None = None) -> bool:
        """Wait until everything was taken, at most for so long. Whether it was; the stream itself stays open."""
        if not self._closing:
            self._closing = True
            self._waiting.put(None)
        end = inf if seconds is None else time.monotonic() + seconds
        while self._thread.is_alive() and time.monotonic() < end:
            self._thread.join(0.1)  # in pieces, so that a signal is served between them
        return not self._thread.is_alive()

    def _pass_on(self) -> None:
        while (text := self._waiting.get()) is not None:
            try:
                self._stream.write(text)
                self._stream.flush()
            except (BrokenPipeError, ValueError):
                self._gone = True
                to_nowhere(self._stream)
                return
            except OSError:
                continue  # a terminal that hung up: what is buffered goes out once there is somewhere else to go


def to_nowhere(stream: TextIO | Outlet) -> None:
    """Let what is still buffered go nowhere, or the interpreter's own flush at exit would print an error."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, stream.fileno())
        os.close(nowhere)
    except (OSError, ValueError):
        return
