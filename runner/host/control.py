"""The control socket of a run: a thread that answers screens and commands, and never waits for any of them.

Rules:
- Watchers ask, and are told; nothing is kept for one that does not ask, so one that died, froze or lags costs nothing.
- A deed becomes a wish on the board and is answered when the engine has had it. The same id again is not done again.
- An abort halts the robot here and now (`Gate.abort`), before the thread that owns the run has even heard of it.
- A flood is taken a batch at a time, with rests between, and the library beneath takes from each sender in turn; so
  the run keeps its share of the processor and an abort is at most one batch behind.
"""

from __future__ import annotations

import contextlib
import os
import threading
import time
from collections import OrderedDict
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

import msgspec
import zmq

from runner.host.address import NAME, control_address
from runner.host.board import Board, Wish
from runner.host.gate import Gate, RobotError
from runner.host.messages import (
    BYTES_MOST,
    VERSION,
    Ask,
    Deed,
    Do,
    Done,
    Fault,
    Leave,
    Look,
    News,
    Told,
    decode_ask,
    encode,
)
from runner.machine.table import Event

BATCH = 32
REST_S = 0.002
"""Between two full batches."""
POLL_MS = 50
WATCHER_GONE_S = 5.0
"""A watcher that has not asked for so long is no watcher any more. Screens ask a few times a second."""
WATCHERS_MOST = 256
LINES_MOST = 200
ANSWERS_MOST = 1_000
"""Deeds whose answers are remembered, for senders that ask again."""
FAREWELL_S = 1.0
"""How long a run that has ended still answers, so that every watcher sees the end."""

EVENTS: dict[Deed, Event | None] = {
    Deed.HOLD: Event.HOLD,
    Deed.RELEASE: Event.RELEASE,
    Deed.SKIP: Event.SKIP,
    Deed.ANSWER: Event.ANSWERED,
    Deed.ABORT: Event.ABORT,
    Deed.SAY: None,
}


@dataclass(slots=True)
class _Deed:
    """A deed taken, and its answer once there is one; `sender` is whoever asked last."""

    sender: bytes
    answer: Done | None = None


class ControlServer:
    """Serves one run. `serving` runs it in a thread of its own."""

    def __init__(self, folder: Path, board: Board, gate: Gate) -> None:
        self._folder = folder
        self._board = board
        self._gate = gate
        self._deeds: OrderedDict[str, _Deed] = OrderedDict()
        self._watchers: dict[str, float] = {}
        self._told_end: set[str] = set()
        self._alone_since = time.monotonic()
        self._lock = threading.Lock()
        self._closing = threading.Event()
        self._ready = threading.Event()
        self._wake_read, self._wake_write = os.pipe2(os.O_NONBLOCK | os.O_CLOEXEC)
        self._outbox: list[tuple[bytes, Told]] = []

    def alone(self) -> float:
        """For how many seconds nobody has watched; 0 while somebody does."""
        return 0.0 if self._watchers else time.monotonic() - self._alone_since

    @contextmanager
    def serving(self) -> Iterator[None]:
        """Serve for as long as the `with` lasts, and a moment longer where there are watchers to be told the end."""
        thread = threading.Thread(target=self._serve, name="control", daemon=True)
        thread.start()
        self._ready.wait(5.0)
        try:
            yield
        finally:
            self._closing.set()
            self._wake()
            thread.join(FAREWELL_S + 5.0)

    # --- the thread -----------------------------------------------------------------------------------------------

    def _serve(self) -> None:
        context = zmq.Context()
        try:
            with control_address(self._folder) as address, context.socket(zmq.ROUTER) as socket:
                socket.setsockopt(zmq.LINGER, 200)
                socket.setsockopt(zmq.MAXMSGSIZE, BYTES_MOST)
                socket.setsockopt(zmq.RCVHWM, 64)
                socket.setsockopt(zmq.SNDHWM, 64)
                socket.bind(address)
                (self._folder / NAME).chmod(0o600)
                self._ready.set()
                self._loop(socket)
        finally:
            (self._folder / NAME).unlink(missing_ok=True)
            context.term()

    def _loop(self, socket: zmq.Socket[bytes]) -> None:
        poller = zmq.Poller()
        poller.register(socket, zmq.POLLIN)
        poller.register(self._wake_read, zmq.POLLIN)
        farewell: float | None = None
        while farewell is None or (time.monotonic() < farewell and not self._all_told()):
            if self._closing.is_set() and farewell is None:
                farewell = time.monotonic() + FAREWELL_S
            poller.poll(POLL_MS)
            with contextlib.suppress(BlockingIOError):
                os.read(self._wake_read, 4096)
            full = self._take_batch(socket)
            self._send_all(socket)
            self._forget_watchers()
            if full:
                time.sleep(REST_S)

    def _take_batch(self, socket: zmq.Socket[bytes]) -> bool:
        for _ in range(BATCH):
            try:
                frames = socket.recv_multipart(zmq.NOBLOCK)
            except zmq.Again:
                return False
            if len(frames) == 2:
                self._take(frames[0], frames[1])
            else:
                self._tell(frames[0], Fault(VERSION, "A message is one frame."))
        return True

    def _take(self, sender: bytes, data: bytes) -> None:
        try:
            ask: Ask = decode_ask(data)
        except (ValueError, msgspec.MsgspecError, RecursionError) as error:
            self._tell(sender, Fault(VERSION, f"Not understood: {error}"))
            return
        match ask:
            case Look():
                self._look(sender, ask)
            case Do():
                self._do(sender, ask)
            case Leave():
                self._watchers.pop(ask.watcher, None)

    def _look(self, sender: bytes, ask: Look) -> None:
        if ask.watcher in self._watchers or len(self._watchers) < WATCHERS_MOST:
            self._watchers[ask.watcher] = time.monotonic()
        lines, last = self._board.lines_after(ask.after, LINES_MOST)
        view = self._board.view()
        if view is not None and view.outcome is not None:
            self._told_end.add(ask.watcher)
        self._tell(sender, News(VERSION, view, lines, last, self._board.view_age(), len(self._watchers)))

    def _do(self, sender: bytes, ask: Do) -> None:
        with self._lock:
            known = self._deeds.get(ask.id)
            if known is not None:
                known.sender = sender
                if known.answer is not None:
                    self._outbox.append((sender, known.answer))
                return
            self._deeds[ask.id] = _Deed(sender)
            while len(self._deeds) > ANSWERS_MOST:
                self._deeds.popitem(last=False)
        problem = self._wish(ask)
        if problem:
            self._answer(ask.id, False, problem)

    def _wish(self, ask: Do) -> str:
        """Pass a deed on; why that cannot be, or nothing."""
        if ask.deed in (Deed.SAY, Deed.ANSWER) and not ask.text.strip():
            return "There is nothing to say."

        def answered(accepted: bool, text: str) -> None:
            self._answer(ask.id, accepted, text)

        taken = self._board.post_wish(Wish(EVENTS[ask.deed], ask.who, ask.text, answered))
        if ask.deed is Deed.ABORT:
            with contextlib.suppress(RobotError):  # the thread that owns the run tries again, and says so
                self._gate.abort()
        return "" if taken else "Too much is being asked of this run at once."

    def _answer(self, deed_id: str, accepted: bool, text: str) -> None:
        """Answer a deed, from whichever thread knows what came of it."""
        answer = Done(VERSION, deed_id, accepted, text)
        with self._lock:
            deed = self._deeds.get(deed_id)
            if deed is None:
                return
            deed.answer = answer
            self._outbox.append((deed.sender, answer))
        self._wake()

    def _tell(self, sender: bytes, told: Told) -> None:
        with self._lock:
            self._outbox.append((sender, told))

    def _send_all(self, socket: zmq.Socket[bytes]) -> None:
        with self._lock:
            waiting, self._outbox = self._outbox, []
        for sender, told in waiting:
            with contextlib.suppress(zmq.Again):  # one that does not read loses what it does not read
                socket.send_multipart([sender, encode(told)], zmq.NOBLOCK)

    def _forget_watchers(self) -> None:
        now = time.monotonic()
        gone = [watcher for watcher, asked in self._watchers.items() if now - asked > WATCHER_GONE_S]
        for watcher in gone:
            del self._watchers[watcher]
        if self._watchers:
            self._alone_since = now

    def _all_told(self) -> bool:
        """Whether every watcher has seen the end, and every deed has its answer."""
        view = self._board.view()
        ended = view is None or view.outcome is None or self._told_end >= set(self._watchers)
        return ended and not self._outbox

    def _wake(self) -> None:
        with contextlib.suppress(BlockingIOError):
            os.write(self._wake_write, b"!")
