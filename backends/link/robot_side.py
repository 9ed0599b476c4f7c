"""The robot's side of the link without its socket: frames in, frames out, a clock that is passed in.

It never raises for anything a controller sends. Whatever the line does, it keeps three promises: one controller at a
time, no goal driven twice, and a robot that stops by itself when its controller is silent.
"""

from __future__ import annotations

import secrets
from collections.abc import Callable
from dataclasses import dataclass
from typing import cast

from backends.contract import Telemetry
from backends.link.adapter import Adapter
from backends.link.duty import NOBODY, Duty, stand_of, still
from backends.link.lease import Lease, LeaseDesk
from backends.link.ledger import Kept, Ledger
from backends.link.messages import (
    VERSION,
    Ability,
    About,
    Beat,
    Charge,
    Command,
    Done,
    Fault,
    FromRobot,
    Go,
    Granted,
    Halt,
    Hello,
    Leave,
    MessageError,
    Seen,
    Simulated,
    State,
    Take,
    ToRobot,
    Trouble,
    encode,
    read_by_robot,
)

FAULTS_A_SECOND = 50.0
"""Faults answered in a second, at most: junk must not turn the robot into a source of junk. Others are only counted."""
ROUTE_POINTS, OBSTACLE_POINTS = 256, 1000
_NEVER_LATE = (Halt, Leave)
"""Commands that only ever stop the robot: they are served however long they were under way."""

Sent = list[tuple[bytes, bytes]]
"""Frames to send, each with the peer it goes to."""


@dataclass(slots=True)
class Counts:
    """What was not served, and why; and what was served, for the one who looks after the robot."""

    served: int = 0
    malformed: int = 0
    without_lease: int = 0
    lease_refused: int = 0
    late: int = 0
    suspended: int = 0
    lapsed: int = 0
    telemetry: int = 0
    telemetry_held_back: int = 0


class RobotSide:
    """One robot's end of the link. `clock` gives seconds that never fall, beginning at 0 or later."""

    def __init__(
        self,
        adapter: Adapter,
        clock: Callable[[], float],
        kept: Kept | None = None,
        token: Callable[[], str] = lambda: secrets.token_hex(16),
    ) -> None:
        self.counts = Counts()
        self.robot = adapter.describe()
        self._clock = clock
        self._token = token
        self._boot = token()
        self._duty = Duty(adapter, Ledger(kept))
        self._desk = LeaseDesk(self.robot.silence, self.robot.term)
        self._states = 0
        self._telemetry = 0
        self._telemetry_stamp = -1.0
        self._next_telemetry = 0.0
        self._faults_left = FAULTS_A_SECOND
        self._faults_at = clock()

    @property
    def leased(self) -> bool:
        """Whether somebody holds the lease."""
        return self._desk.lease is not None

    def worth_keeping(self) -> Kept | None:
        """What a restart of the robot's program should not lose; None where it did not change since the last call."""
        ledger = self._duty.ledger
        if not ledger.dirty:
            return None
        ledger.dirty = False
        return ledger.kept()

    # --- frames

    def receive(self, peer: bytes, person: str, frame: bytes) -> Sent:
        """Serve one frame from a peer that was admitted with that key (empty on a plain line).

        What it changes is told by the `turn` after it, so that the answer is not kept waiting.
        """
        try:
            message = read_by_robot(frame)
        except MessageError as error:
            self.counts.malformed += 1
            return self._fault(peer, error.code, error.what)
        return [(peer, encode(answer)) for answer in self._serve(peer, person, message)]

    def _serve(self, peer: bytes, person: str, message: ToRobot) -> list[FromRobot]:
        now = self._clock()
        if isinstance(message, Hello):
            return [self._about()]
        if isinstance(message, Take):
            return self._take(message, peer, person, now)
        lease = self._desk.holder(message.lease, peer, person)
        if lease is None:
            self.counts.without_lease += 1
            number = None if isinstance(message, Beat) else message.number
            return self._faulty("no lease", "This token is not that of the lease in force.", number)
        self.counts.served += 1
        if isinstance(message, Beat):
            lease.seen = max(lease.seen, min(message.seen, self._telemetry))
            self._desk.alive(lease, message.heard, now)
            return [self._state(now, message.sent)]
        return self._command(lease, message, now)

    def _take(self, message: Take, peer: bytes, person: str, now: float) -> list[FromRobot]:
        if message.version != VERSION:
            return self._faulty("version", f"This robot speaks version {VERSION}, not {message.version}.")
        before = self._desk.lease
        token = self._desk.take(message, peer, person, self._token(), now)
        if token is None:
            self.counts.lease_refused += 1
            return self._faulty("taken", "Another controller holds the lease.")
        if self._desk.lease is not before and self._desk.lease is not None:
            self._desk.lease.seen = self._telemetry
            self._duty.resume_session(message.session)
        return [Granted(message.nonce, token, self._boot, now, self.robot.silence, self.robot.term)]

    def _command(self, lease: Lease, message: Command, now: float) -> list[FromRobot]:
        """Each number once: what comes again is answered again, what was overtaken is never served."""
        if (kept := lease.answer(message.number)) is not None:
            return [kept]
        if not isinstance(message, _NEVER_LATE) and not self._desk.alive(lease, message.heard, now):
            self.counts.late += 1
            return self._faulty("too old", "It was under way for longer than the agreed silence.", message.number)
        answer = self._perform(message, now)
        lease.keep(answer)
        return [answer]

    def _perform(self, message: Command, now: float) -> Done:
        duty = self._duty
        match message:
            case Go():
                answer = duty.go(message, now)
            case Halt():
                duty.halt(now)
                answer = Done(message.number, "taken")
            case Leave():
                duty.abandon("The controller left.", now)
                self._desk.end()
                answer = Done(message.number, "taken")
            case Charge():
                answer = duty.charge(message.number)
            case _:
                answer = duty.act(message, now)
        return answer

    def _faulty(self, code: Trouble, what: str, number: int | None = None) -> list[FromRobot]:
        return [Fault(code, what, number)] if self._may_fault() else []

    def _fault(self, peer: bytes, code: Trouble, what: str) -> Sent:
        return [(peer, encode(fault)) for fault in self._faulty(code, what)]

    def _may_fault(self) -> bool:
        now = self._clock()
        self._faults_left = min(FAULTS_A_SECOND, self._faults_left + FAULTS_A_SECOND * (now - self._faults_at))
        self._faults_at = now
        if self._faults_left < 1.0:
            return False
        self._faults_left -= 1.0
        return True

    # --- time

    def turn(self) -> Sent:
        """Look at the clock and at the adapter; to be called many times a second, frames or not."""
        now = self._clock()
        self._duty.take_news(now)
        if self._desk.over(now):
            self.counts.lapsed += 1
            self._duty.abandon(f"{NOBODY} The lease ended after {self.robot.term:g} s.", now)
            self._desk.end()
        elif self._desk.silent(now) and self._duty.active:
            self.counts.suspended += 1
            self._duty.suspend(now)
        return self._told() + self._seen(now)

    def stop(self) -> None:
        """The robot's program ends: whatever is under way, the robot stops. The goal stays open for the next start."""
        self._duty.suspend(self._clock())

    def _told(self) -> Sent:
        """The state, where it changed and somebody is there to be told."""
        lease = self._desk.lease
        if not self._duty.changed or lease is None:
            return []
        self._duty.changed = False
        return [(lease.peer, encode(self._state(self._clock(), None)))]

    def _seen(self, now: float) -> Sent:
        """Telemetry, where it is due, new, and not more is under way than the controller asked for."""
        lease = self._desk.lease
        if lease is None or now < self._next_telemetry:
            return []
        seen = self._duty.look()
        if seen.stamp <= self._telemetry_stamp:
            return []
        self._next_telemetry = max(self._next_telemetry + lease.every, now)
        if self._telemetry - lease.seen >= lease.window:
            self.counts.telemetry_held_back += 1
            return []
        self._telemetry += 1
        self._telemetry_stamp = seen.stamp
        self.counts.telemetry += 1
        return [(lease.peer, encode(_telemetry(self._telemetry, seen)))]

    # --- messages

    def _about(self) -> About:
        robot = self.robot
        simulated = Simulated(robot.pace, robot.begins) if robot.begins else None
        abilities = cast("list[Ability]", sorted(robot.abilities))
        return About([VERSION], robot.name, robot.site, abilities, robot.silence, robot.term, robot.speed, simulated)

    def _state(self, now: float, echo: float | None) -> State:
        self._states += 1
        duty = self._duty
        session = duty.ledger.current
        return State(
            number=self._states,
            stamp=now,
            boot=self._boot,
            echo=echo,
            goal=session.goal,
            suspended=duty.suspended,
            standing=still(duty.look()),
            telemetry=self._telemetry,
            actions=list(session.ended_actions),
        )


def _telemetry(number: int, seen: Telemetry) -> Seen:
    """Telemetry as it goes over the line: positions to the millimeter."""
    return Seen(
        number=number,
        stamp=seen.stamp,
        pose=stand_of(seen.pose),
        spread=seen.spread,
        speed=seen.speed,
        turn_rate=seen.turn_rate,
        battery=min(1.0, max(0.0, seen.battery)),
        driven=seen.driven,
        remaining=seen.remaining,
        route_number=seen.route_number,
        route=[(round(x, 3), round(y, 3)) for x, y in seen.route[:ROUTE_POINTS]],
        obstacles=[(round(x, 3), round(y, 3)) for x, y in seen.obstacles[:OBSTACLE_POINTS]],
    )
