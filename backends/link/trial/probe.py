"""A controller that an adapter's trial can have misbehave: it sends what it is told, and notes what comes."""

from __future__ import annotations

import secrets
import time
from collections.abc import Callable
from typing import TypeVar

import zmq

from backends.contract import Line
from backends.link.client import keys_of
from backends.link.messages import (
    VERSION,
    Beat,
    Done,
    Fault,
    FromRobot,
    Go,
    Granted,
    Halt,
    Leave,
    MessageError,
    Seen,
    Stand,
    State,
    Take,
    ToRobot,
    encode,
    read_by_controller,
)
from backends.link.sockets import controller_socket

M = TypeVar("M", bound=FromRobot)
PATIENCE_S = 1.5
"""How long an answer may take, seconds."""
BEAT_S = 0.1


class FailedError(Exception):
    """The adapter did not do as it must, in a sentence."""


class Probe:
    """One connection to the robot, and the lease if it took it."""

    def __init__(self, context: zmq.Context[zmq.Socket[bytes]], line: Line) -> None:
        self._socket = controller_socket(context, line.address, keys_of(line))
        self._began = time.monotonic()
        self._next_beat = 0.0
        self.granted: Granted | None = None
        self.state: State | None = None
        self.telemetry: list[Seen] = []
        self.unread: list[str] = []
        """What the robot sent that is no message."""
        self.heard = 0.0
        self.frozen: float | None = None
        """Where beats are to say that nothing newer than this was heard."""
        self.number = 0

    def now(self) -> float:
        return time.monotonic() - self._began

    def close(self) -> None:
        """Give the lease back if the robot is still there, and go."""
        if self.granted is not None and self._socket.poll(0, zmq.POLLOUT):
            self.command(Leave)
            self.pump(0.05)
        self._socket.close()

    # --- out

    def send(self, message: ToRobot) -> None:
        """Send a message as it is."""
        self.send_frame(encode(message))

    def send_frame(self, frame: bytes) -> None:
        """Send bytes as they are, waiting for the connection if there is none yet."""
        self.wait_until_connected(PATIENCE_S)
        self._socket.send(frame)

    def wait_until_connected(self, seconds: float) -> None:
        """FailedError where nobody is there."""
        if not self._socket.poll(int(seconds * 1e3), zmq.POLLOUT):
            raise FailedError("The robot accepts no connection.")

    def beat(self) -> float:
        """One sign of life; its `sent` is handed back."""
        sent = self.now()
        heard = self.heard if self.frozen is None else self.frozen
        seen = max((seen.number for seen in self.telemetry), default=0)
        seen = max(seen, self.state.telemetry if self.state else 0)
        self.send(Beat(self.token, sent, heard, seen))
        return sent

    @property
    def token(self) -> str:
        assert self.granted is not None
        return self.granted.lease

    def take(self, session: str, every: float = 0.05, window: int = 100, nonce: str | None = None) -> Granted:
        """Take the lease, and hear the first state."""
        request = Take(VERSION, session, nonce or secrets.token_hex(16), "trial", every, window)
        self.send(request)
        self.granted = self.wait(Granted, lambda granted: granted.nonce == request.nonce, what="`granted`")
        self.heard = max(self.heard, self.granted.stamp)
        self.beat()
        self.wait(State, what="`state`")
        return self.granted

    def command(self, make: Callable[[str, int], ToRobot]) -> int:
        """Send a command with the next number, which is handed back."""
        self.number += 1
        self.send(make(self.token, self.number))
        return self.number

    def go(self, goal: int, pose: Stand, speed: float) -> str:
        """Send a goal and hand back the outcome."""
        return self.outcome(self.command(lambda lease, number: Go(lease, number, self.heard, goal, pose, speed)))

    def halt(self) -> str:
        """Send a halt and hand back the outcome."""
        return self.outcome(self.command(Halt))

    # --- in

    def outcome(self, number: int) -> str:
        """The outcome of a command."""
        answer = self.wait(Done, lambda done: done.number == number, what="`done`")
        return answer.outcome

    def fault(self, code: str) -> Fault:
        """The fault of that code."""
        return self.wait(Fault, lambda fault: fault.code == code, what=f"the fault `{code}`")

    def wait(
        self,
        kind: type[M],
        accepts: Callable[[M], bool] = lambda _: True,
        seconds: float = PATIENCE_S,
        what: str = "an answer",
        beats: bool = False,
    ) -> M:
        """The next message of a kind. FailedError where none comes."""
        end = self.now() + seconds
        while (left := end - self.now()) > 0.0:
            for message in self._turn(min(left, BEAT_S), beats):
                if isinstance(message, kind) and accepts(message):
                    return message
        raise FailedError(f"Within {seconds:g} s the robot did not send {what}.{self._unread()}")

    def pump(self, seconds: float, beats: bool = False) -> list[FromRobot]:
        """Take in what comes for so long."""
        found: list[FromRobot] = []
        end = self.now() + seconds
        while (left := end - self.now()) > 0.0:
            found += self._turn(min(left, BEAT_S), beats)
        return found

    def until(self, holds: Callable[[], bool], seconds: float, what: str) -> None:
        """Stay alive until something holds. FailedError, with what it was, where it does not."""
        end = self.now() + seconds
        while not holds():
            if self.now() > end:
                raise FailedError(f"Within {seconds:g} s {what}.{self._unread()}")
            self._turn(BEAT_S, beats=True)

    def _turn(self, seconds: float, beats: bool) -> list[FromRobot]:
        if beats and self.now() >= self._next_beat:
            self._next_beat = self.now() + BEAT_S
            self.beat()
        found: list[FromRobot] = []
        if self._socket.poll(max(1, int(seconds * 1e3))):
            while self._socket.poll(0):
                found += self._note(self._socket.recv())
        return found

    def _note(self, frame: bytes) -> list[FromRobot]:
        try:
            message = read_by_controller(frame)
        except MessageError as error:
            self.unread.append(error.what)
            return []
        if isinstance(message, State | Seen):
            self.heard = max(self.heard, message.stamp)
        if isinstance(message, State):
            self.state = message
        if isinstance(message, Seen):
            self.telemetry.append(message)
        return [message]

    def _unread(self) -> str:
        return f" It sent what is no message: {self.unread[-1]}" if self.unread else ""
