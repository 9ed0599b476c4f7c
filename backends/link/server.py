"""A robot on a socket: an adapter with its six methods, and everything else done for it.

    server = RobotServer(MyAdapter(), Listening("tcp://127.0.0.1:7410"), clock=time.monotonic)
    server.run(until=stopped)          # a threading.Event, or anything with is_set()

One thread does all: it serves frames, asks the adapter for news, and stops the robot when its controller is silent. So
an adapter's methods must return at once; one that hangs keeps the robot from being stopped by the link, and nothing but
the robot's own protective stop is left.
"""

from __future__ import annotations

import logging
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Protocol

import zmq

from backends.link.adapter import Adapter
from backends.link.gate import Gate
from backends.link.ledger import Kept
from backends.link.robot_side import RobotSide, Sent
from backends.link.sockets import AND_MORE, NOW, Keys, check_line, frame_waits, robot_socket, wait_for_frames

TURN_MS = 10
"""Longest time between two looks at the clock and the adapter."""
FRAMES_A_TURN = 64
"""Frames served before the clock is looked at again, however many wait."""

log = logging.getLogger("trundle.link")


class Stopped(Protocol):
    """Something that says when to stop, such as a `threading.Event`."""

    def is_set(self) -> bool: ...


@dataclass(frozen=True, slots=True)
class Listening:
    """Where a robot is to be reached, and by whom. `allowed` are public keys and whose they are; without keys the
    line is plain, which is for this computer only, unless `insecure`."""

    address: str
    keys: Keys | None = None
    allowed: dict[bytes, str] = field(default_factory=dict)
    insecure: bool = False


class RobotServer:
    """Serves one robot on one address. `keep` is called with what is worth keeping whenever that changed."""

    def __init__(
        self,
        adapter: Adapter,
        listening: Listening,
        clock: Callable[[], float],
        kept: Kept | None = None,
        keep: Callable[[Kept], None] = lambda _: None,
    ) -> None:
        """BackendError where the address is none, is taken, or would let everybody in."""
        check_line(listening.address, listening.keys is not None, listening.insecure)
        self.side = RobotSide(adapter, clock, kept)
        self._keep = keep
        self._context: zmq.Context[zmq.Socket[bytes]] = zmq.Context()
        self.gate = Gate(self._context, listening.allowed) if listening.keys is not None else None
        try:
            self._socket = robot_socket(self._context, listening.address, listening.keys)
        except BaseException:
            self.close()
            raise
        self._sockets = (self._socket,) if self.gate is None else (self._socket, self.gate.socket)

    def run(self, until: Stopped) -> None:
        """Serve until told to stop. Whatever ends it, the robot is stopped."""
        try:
            while not until.is_set():
                self._turn()
        finally:
            self.side.stop()
            self.close()

    def _turn(self) -> None:
        """Serve what waits, or comes within a turn, and look at the clock once."""
        waiting = wait_for_frames(self._sockets, TURN_MS)
        if self.gate is not None and self.gate.socket in waiting:
            self.gate.turn()
        left = FRAMES_A_TURN if self._socket in waiting else 0
        while left:
            self._take_frame()
            left = left - 1 if frame_waits(self._socket) else 0
        self._send(self.side.turn())
        self._keep_what_changed()

    def _take_frame(self) -> None:
        """Serve one message, which is a frame behind the name of the peer. Whose key it came under is known only to the
        library's own frames."""
        peer = self._socket.recv(NOW)
        frame = self._socket.recv(NOW, copy=False)
        if frame.more:
            self._throw_away()
            return
        person = "" if self.gate is None else str(frame.get("User-Id"))
        answers = self.side.receive(peer, person, frame.bytes)
        self._keep_what_changed()
        self._send(answers)

    def _throw_away(self) -> None:
        """The rest of a message of more than one frame, which is none of ours."""
        while self._socket.recv(NOW, copy=False).more:
            pass
        self.side.counts.malformed += 1

    def _keep_what_changed(self) -> None:
        """Written before an answer is sent: what was promised outlives this process."""
        if (kept := self.side.worth_keeping()) is not None:
            self._keep(kept)

    def _send(self, frames: Sent) -> None:
        for peer, frame in frames:
            try:
                self._socket.send(peer, AND_MORE)
                self._socket.send(frame, NOW)
            except zmq.ZMQError as error:
                log.debug("a frame was dropped: %s", error.strerror)

    def close(self) -> None:
        """Stop listening."""
        if self.gate is not None:
            self.gate.close()
        self._context.destroy(linger=0)
