"""The one door to the robot. Everything that is sent to it passes here, one call at a time, from whichever thread.

Two things are promised that the backend alone cannot:
- An abort halts the robot at once, whatever the thread that owns the run is busy with: the control thread comes in
  here by itself. From then on nothing but a halt is let through, so that a goal decided a moment before cannot start
  the robot again.
- What the backend raises comes out as a `RobotError` with a sentence, so that trouble with the robot can be told
  from a fault of ours.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from typing import Any

from backends.contract import Backend, LineQuality, OnALine, Report, TellsTruth, Truth


class RobotError(Exception):
    """The backend failed, in a sentence."""


class Gate:
    """A backend, made safe to share between the thread that owns a run and the one that takes a person's wishes."""

    def __init__(self, backend: Backend) -> None:
        self._backend = backend
        self._teller = backend if isinstance(backend, TellsTruth) else None
        self._on_a_line = backend if isinstance(backend, OnALine) else None
        self._lock = threading.Lock()
        self._aborting = threading.Event()
        self._halted = False

    @property
    def aborting(self) -> bool:
        """Whether an abort has been asked for."""
        return self._aborting.is_set()

    def abort(self) -> None:
        """Halt the robot now, and let nothing but halts through any more. From any thread."""
        self._aborting.set()
        with self._lock:
            self._halt_once()

    def halt(self) -> None:
        """Halt the robot. RobotError where that cannot be sent."""
        with self._lock:
            self._call(self._backend.halt)

    def try_halt(self) -> str:
        """Halt the robot as far as it can still be reached; what went wrong, or nothing."""
        try:
            self.halt()
        except RobotError as error:
            return str(error)
        return ""

    def command(self, send: Callable[[Backend, Any], None], command: object) -> None:
        """Send a command by its function, unless the run is being aborted."""
        with self._lock:
            if self.aborting:
                self._halt_once()
            else:
                self._call(send, self._backend, command)

    def reports(self, until: float) -> Sequence[Report]:
        """What the robot has to say, as `Backend.reports`."""
        with self._lock:
            if self.aborting:
                self._halt_once()
            reports: Sequence[Report] = self._call(self._backend.reports, until)
            return reports

    def truths(self) -> Sequence[Truth]:
        """What really was the case since the last call; nothing where the backend cannot tell."""
        if self._teller is None:
            return ()
        with self._lock:
            truths: Sequence[Truth] = self._call(self._teller.truths)
            return truths

    def quality(self) -> LineQuality | None:
        """How good the line to the robot is; None where there is none."""
        on_a_line = self._on_a_line
        if on_a_line is None:
            return None
        with self._lock:
            quality: LineQuality = self._call(lambda: on_a_line.quality)
            return quality

    def _halt_once(self) -> None:
        """Whoever gets the lock first after an abort halts, so that an abort never waits for its turn."""
        if not self._halted:
            self._call(self._backend.halt)
            self._halted = True

    def _call(self, function: Callable[..., Any], *arguments: Any) -> Any:
        try:
            return function(*arguments)
        except Exception as error:
            raise RobotError(f"The robot's backend failed: {type(error).__name__}: {error}") from error
