"""The link as a backend: a robot on a socket, in the words of `backends.contract`.

There is no thread here, on purpose. Signs of life go out while the host asks for reports; a host that hangs falls
silent, and the robot stops. Nothing is queued for a robot that cannot be reached: commands wait here and are sent when
they can be, telemetry is taken in to the last and only the newest is handed on.
"""

from __future__ import annotations

import hashlib
import secrets
import socket as names
import time
from collections.abc import Callable, Sequence
from datetime import datetime, timedelta
from math import ceil
from pathlib import Path
from typing import NoReturn

import zmq

from backends.contract import BackendError, Capability, Clock, Goal, Line, LineQuality, Report, Setup
from backends.link.controller import Controller
from backends.link.duty import stand_of
from backends.link.keys import public_of, read_public, read_secret
from backends.link.messages import Charge, Clear, EaseBack, Relocate, Replan, State
from backends.link.sockets import NOW, Keys, check_line, controller_socket, frame_waits, wait_for_frames
from runner.site.values import Pose

GREETING_S = 5.0
OPENING_S = 10.0
LEAVING_S = 1.0
FRAMES_A_TURN = 256
EAGER_S = 0.0005
"""After a command its answer is looked for without sleeping for so long: on a wire, to fall asleep and be woken takes
longer than all that both programs do."""


class LinkClock:
    """This computer's monotonic clock, begun at 0; at a simulated robot's pace where the robot is one."""

    def __init__(self) -> None:
        self._pace = 1.0
        self._began = time.monotonic()
        self.wall_at_zero: datetime | None = None
        """The simulated wall time at 0; None where the wall clock of this computer is meant."""

    @property
    def virtual(self) -> bool:
        return False

    @property
    def pace(self) -> float:
        """Its seconds per second."""
        return self._pace

    def begin(self, pace: float) -> None:
        """Begin at 0 again."""
        self._pace = pace
        self._began = time.monotonic()

    def now(self) -> float:
        return (time.monotonic() - self._began) * self._pace

    def wall(self) -> datetime:
        if self.wall_at_zero is None:
            return datetime.now()
        return self.wall_at_zero + timedelta(seconds=self.now())


class LinkBackend:
    """One robot on a socket. Use it from one thread at a time."""

    def __init__(self, setup: Setup) -> None:
        """BackendError where there is no address, or the keys are not in order. Nothing is sent yet."""
        if setup.line is None:
            raise BackendError("Say where the robot is: --robot tcp://HOST:PORT")
        self._line = setup.line
        self._site = setup.site.name
        keys = keys_of(setup.line)
        check_line(setup.line.address, keys is not None, setup.line.insecure)
        self._clock = LinkClock()
        self.controller = Controller(session_of(setup.line), f"trundle on {names.gethostname()}"[:100], self._clock.now)
        self._context: zmq.Context[zmq.Socket[bytes]] = zmq.Context()
        self._socket = controller_socket(self._context, setup.line.address, keys)
        self._monitor = self._socket.get_monitor_socket(zmq.EVENT_HANDSHAKE_FAILED_AUTH)
        self._eager_until = 0.0

    @property
    def clock(self) -> Clock:
        return self._clock

    @property
    def capabilities(self) -> frozenset[Capability]:
        """What the robot says it can do; it is asked the first time."""
        self._greet()
        assert self.controller.about is not None
        abilities = set(self.controller.about.abilities)
        return frozenset(capability for capability in Capability if capability.value in abilities)

    @property
    def quality(self) -> LineQuality:
        """How good the line is."""
        return self.controller.line.quality(self._clock.now())

    @property
    def state(self) -> State | None:
        """What the robot said last of its goal."""
        return self.controller.state

    def preparation(self) -> str:
        return f"Taking control of the robot at {self._line.address}."

    def open(self) -> None:
        self._greet()
        self._begin_clock()
        if not self._pump(lambda: self.controller.ready, OPENING_S):
            raise BackendError(
                f"The robot at {self._line.address} does not hand over control: somebody else may be driving it."
            )
        self._set_wall()

    def _greet(self) -> None:
        if self.controller.about is not None:
            return
        self._pump(lambda: self.controller.about is not None or self._turned_away(), GREETING_S)
        about = self.controller.about
        if about is None:
            self._say_why_not()
        if about.site and about.site != self._site:
            raise BackendError(f'The robot is on the site "{about.site}", the mission is for "{self._site}".')

    def _say_why_not(self) -> NoReturn:
        if self._turned_away():
            raise BackendError(
                f"The robot at {self._line.address} does not admit this key, or is not the one expected."
            )
        raise BackendError(
            f"No robot answers at {self._line.address} within {GREETING_S:.0f} s. "
            "Is it switched on, is the address right, and do both sides use keys or neither?"
        )

    def _turned_away(self) -> bool:
        """Whether the robot refused our key, or ours refused its."""
        return self._monitor is not None and bool(self._monitor.poll(0))

    def _begin_clock(self) -> None:
        simulated = self.controller.about.simulated if self.controller.about else None
        self._clock.begin(simulated.pace if simulated else 1.0)

    def _set_wall(self) -> None:
        """A simulated robot has a time of day of its own."""
        simulated = self.controller.about.simulated if self.controller.about else None
        if simulated is None:
            return
        try:
            begins = datetime.fromisoformat(simulated.begins).replace(tzinfo=None)
        except ValueError:
            raise BackendError(f'The robot names no time of day: "{simulated.begins}".') from None
        self._clock.wall_at_zero = begins + timedelta(seconds=self.controller.line.offset)

    # --- commands

    def go(self, goal: Goal) -> None:
        self.controller.go(goal)
        self._send_command()

    def halt(self) -> None:
        self.controller.halt()
        self._send_command()

    def clear(self, action_id: int, radius: float) -> None:
        self.controller.act(action_id, lambda lease, number, heard: Clear(lease, number, heard, action_id, radius))
        self._send_command()

    def replan(self, action_id: int) -> None:
        self.controller.act(action_id, lambda lease, number, heard: Replan(lease, number, heard, action_id))
        self._send_command()

    def ease_back(self, action_id: int, distance: float) -> None:
        self.controller.act(action_id, lambda lease, number, heard: EaseBack(lease, number, heard, action_id, distance))
        self._send_command()

    def relocate(self, action_id: int, pose: Pose | None) -> None:
        near = None if pose is None else stand_of(pose)
        self.controller.act(action_id, lambda lease, number, heard: Relocate(lease, number, heard, action_id, near))
        self._send_command()

    def charge(self) -> None:
        self.controller.order(Charge)
        self._send_command()

    # --- reports

    def reports(self, until: float) -> Sequence[Report]:
        while True:
            self._exchange()
            if found := self.controller.reports():
                return found
            now = self._clock.now()
            if now >= until:
                return []
            self._wait(min(until, self.controller.next_due()) - now)

    def close(self) -> None:
        if self._context.closed:
            return
        try:
            if self.controller.ready:
                self.controller.leave()
                self._pump(lambda: self.controller.settled, LEAVING_S)
        except BackendError:
            pass  # it is not ours any more, so there is nothing to give back
        finally:
            self._socket.disable_monitor()
            self._context.destroy(linger=0)

    # --- the socket

    def _pump(self, done: Callable[[], bool], seconds: float) -> bool:
        """Exchange frames until something holds, at most for so many seconds of wall time."""
        deadline = time.monotonic() + seconds
        while True:
            self._exchange()
            if done():
                return True
            left = deadline - time.monotonic()
            if left <= 0.0:
                return False
            self._wait(min(left * self._clock.pace, self.controller.next_due() - self._clock.now()))

    def _wait(self, seconds: float) -> None:
        """Wait for a frame, at most so many seconds of our clock."""
        wall = max(0.0, seconds) / self._clock.pace
        while time.monotonic() < self._eager_until and not self.controller.settled:
            if frame_waits(self._socket):
                return
        wait_for_frames((self._socket,), ceil(wall * 1e3))

    def _exchange(self) -> None:
        self._receive()
        self._send()

    def _receive(self) -> None:
        for _ in range(FRAMES_A_TURN):
            if not frame_waits(self._socket):
                return
            self.controller.receive(self._socket.recv(NOW))

    def _send_command(self) -> None:
        self._send()
        self._eager_until = time.monotonic() + EAGER_S

    def _send(self) -> None:
        for frame in self.controller.due():
            try:
                self._socket.send(frame, NOW)
            except zmq.Again:
                return  # nobody is there; what matters is sent again


def keys_of(line: Line) -> Keys | None:
    """The keys of a line, None for a plain one. BackendError where only one of the two is given."""
    if not line.key_file and not line.robot_key_file:
        return None
    if not line.key_file or not line.robot_key_file:
        raise BackendError("Keys come in two files: our own secret one, and the public one of the robot.")
    secret = read_secret(Path(line.key_file))
    return Keys(secret, public_of(secret), read_public(Path(line.robot_key_file)))


def session_of(line: Line) -> str:
    """The name of a run as the robot hears it: short, and of plain characters whatever the run is called."""
    if not line.session:
        return secrets.token_hex(16)
    return hashlib.sha256(line.session.encode()).hexdigest()[:32]
