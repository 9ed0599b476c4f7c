"""The other side of the control socket: commands that want an answer, and a run watched from another process.

`RemoteSource` is what a screen pulls from. It talks to the run in a thread of its own, so that no call of the screen
ever waits; how old its news is it says itself (`age`), because news that is old must not be shown as new.
"""

from __future__ import annotations

import getpass
import os
import queue
import threading
import time
import uuid
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

import zmq

from runner.host.address import control_address
from runner.host.messages import VERSION, Deed, Do, Done, Fault, Leave, Look, News, Told, decode_told, encode
from runner.host.view import FeedLine, Health, View
from runner.journal.errors import JournalError
from runner.journal.outcome import outcome_of
from runner.journal.reader import is_owned, open_record
from runner.machine.table import Event

ANSWER_S = 5.0
"""How long a command waits for its answer."""
ASK_AGAIN_S = 1.0
LOOK_S = 0.25
GONE_S = 2.0
"""After so long without an answer, see whether the process is there at all."""
FEED_LINES_MOST = 5_000

DEEDS: dict[Event, Deed] = {
    Event.HOLD: Deed.HOLD,
    Event.RELEASE: Deed.RELEASE,
    Event.SKIP: Deed.SKIP,
    Event.ABORT: Deed.ABORT,
}


class UnreachableError(Exception):
    """The process that owns the run does not answer, in a sentence."""


def person() -> str:
    """Who sits here, and where: the system's user, the terminal, the address an SSH client came from."""
    try:
        name = getpass.getuser()
    except (KeyError, OSError):
        name = f"user {os.getuid()}"
    where = [part for part in (_terminal(), os.environ.get("SSH_CONNECTION", "").split(" ")[0]) if part]
    return f"{name} ({', '.join(where)})"[:120] if where else name[:120]


def _terminal() -> str:
    for number in (0, 1, 2):
        try:
            return os.ttyname(number).removeprefix("/dev/")
        except OSError:
            continue
    return ""


def do(folder: Path, deed: Deed, text: str = "", seconds: float = ANSWER_S) -> Done:
    """Do something to a run, and wait until the engine has had it. UnreachableError where nobody answers.

    It is asked again under the same id where the answer is slow, and done once all the same.
    """
    asked = Do(VERSION, uuid.uuid4().hex, person(), deed, text)
    with _connected(folder) as socket:
        end = time.monotonic() + seconds
        while (left := end - time.monotonic()) > 0.0:
            socket.send(encode(asked))
            told = _receive(socket, min(left, ASK_AGAIN_S))
            if isinstance(told, Done) and told.id == asked.id:
                return told
            if isinstance(told, Fault):
                raise UnreachableError(told.text)
    raise UnreachableError(
        f"The process that owns the run {folder.name} is there, but did not answer in {seconds:g} s."
    )


def look(folder: Path, seconds: float = 0.5) -> News:
    """Where a run stands. UnreachableError where nobody answers in time."""
    with _connected(folder) as socket:
        watcher = uuid.uuid4().hex
        socket.send(encode(Look(VERSION, watcher, person())))
        told = _receive(socket, seconds)
        socket.send(encode(Leave(VERSION, watcher)))
    if isinstance(told, News):
        return told
    raise UnreachableError(told.text if isinstance(told, Fault) else f"The run {folder.name} did not answer.")


@contextmanager
def _connected(folder: Path) -> Iterator[zmq.Socket[bytes]]:
    """A socket to the run. UnreachableError where no process owns it."""
    if not is_owned(folder):
        raise UnreachableError(f"No process owns the run {folder.name}: it has ended, or its process died.")
    context = zmq.Context()
    try:
        with control_address(folder) as address, context.socket(zmq.DEALER) as socket:
            socket.setsockopt(zmq.LINGER, 200)
            socket.setsockopt(zmq.SNDHWM, 64)
            socket.setsockopt(zmq.SNDTIMEO, 1000)
            socket.connect(address)
            yield socket
    except zmq.Again as error:
        raise UnreachableError(f"The process that owns the run {folder.name} takes no messages.") from error
    finally:
        context.term()


def _receive(socket: zmq.Socket[bytes], seconds: float) -> Told | None:
    if not socket.poll(int(seconds * 1000)):
        return None
    try:
        return decode_told(socket.recv())
    except ValueError as error:
        raise UnreachableError(f"The run's answer cannot be read: {error}") from error


class RemoteSource:
    """A run watched through its control socket. Use it in a `with`; every other call returns at once."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder
        self._who = person()
        self._watcher = uuid.uuid4().hex
        self._view: View | None = None
        self._heard_at = time.monotonic()
        self._age = 0.0
        self._lines: list[FeedLine] = []
        self._last = 0
        self._deeds: queue.SimpleQueue[Do] = queue.SimpleQueue()
        self._unanswered: dict[str, tuple[Do, float]] = {}
        self._answers: list[Done] = []
        self._lock = threading.Lock()
        self._closing = threading.Event()
        self._thread = threading.Thread(target=self._talk, name="remote", daemon=True)

    def __enter__(self) -> RemoteSource:
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._closing.set()
        self._thread.join(2.0)

    # --- for the screen

    def view(self) -> View | None:
        """The latest view that came, however old (`age`); None before the first."""
        return self._view

    def age(self) -> float:
        """Seconds since the run gave the sign of life that the latest view shows."""
        return time.monotonic() - self._heard_at + self._age

    def feed(self) -> Sequence[FeedLine]:
        """Lines that are new since the last call, oldest first."""
        with self._lock:
            lines, self._lines = self._lines, []
        return lines

    def answers(self) -> Sequence[Done]:
        """What came of deeds since the last call."""
        with self._lock:
            answers, self._answers = self._answers, []
        return answers

    def act(self, event: Event) -> None:
        """Pass on what the person at this screen asks for."""
        self.do(DEEDS[event])

    def do(self, deed: Deed, text: str = "") -> str:
        """Pass on a deed, also one with a text. Its id, by which `answers` tells what came of it."""
        asked = Do(VERSION, uuid.uuid4().hex, self._who, deed, text)
        self._deeds.put(asked)
        return asked.id

    # --- the thread

    def _talk(self) -> None:
        """Talk to the run, and to the process that comes after it where it is picked up meanwhile."""
        while not self._closing.is_set():
            try:
                with _connected(self._folder) as socket:
                    self._converse(socket)
            except (UnreachableError, OSError):
                self._say_what_became_of_it()
                self._closing.wait(1.0)

    def _converse(self, socket: zmq.Socket[bytes]) -> None:
        """Until leaving, or until nothing has been heard for so long that the process must be looked for anew."""
        next_look, heard_at = 0.0, time.monotonic()
        while not self._closing.is_set():
            now = time.monotonic()
            self._send_deeds(socket, now)
            if now >= next_look:
                next_look = now + LOOK_S
                socket.send(encode(Look(VERSION, self._watcher, self._who, self._last)), zmq.NOBLOCK)
            told = _receive(socket, 0.02)
            if told is not None:
                heard_at = time.monotonic()
                self._hear(told)
            elif now - heard_at > GONE_S and not is_owned(self._folder):
                return
        socket.send(encode(Leave(VERSION, self._watcher)), zmq.NOBLOCK)

    def _send_deeds(self, socket: zmq.Socket[bytes], now: float) -> None:
        while not self._deeds.empty():
            asked = self._deeds.get()
            self._unanswered[asked.id] = (asked, 0.0)
        for asked, again_at in list(self._unanswered.values()):
            if now >= again_at:
                self._unanswered[asked.id] = (asked, now + ASK_AGAIN_S)
                socket.send(encode(asked), zmq.NOBLOCK)

    def _hear(self, told: Told) -> None:
        match told:
            case News():
                with self._lock:
                    self._lines = [*self._lines, *told.lines][-FEED_LINES_MOST:]
                self._last = told.last
                self._view, self._age, self._heard_at = told.view or self._view, told.age, time.monotonic()
            case Done():
                self._unanswered.pop(told.id, None)
                with self._lock:
                    self._answers.append(told)

    def _say_what_became_of_it(self) -> None:
        """No process owns the run: the last view says how it ended, which only the record knows now."""
        self._last = 0 if self._view is None else self._last
        if self._view is not None and self._view.outcome is not None:
            return
        try:
            with open_record(self._folder) as record:
                outcome = outcome_of(record).value
        except JournalError as error:
            outcome = str(error)
        last = self._view or View(0.0, "00:00:00", Health.ENDED, "")
        self._view = replace(last, health=Health.ENDED, reason="no process owns this run any more", outcome=outcome)
