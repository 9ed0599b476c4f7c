"""The adapter trial: every requirement of PROTOCOL.md against a live robot, with pass, fail and why."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator
from dataclasses import dataclass
from enum import Enum

import zmq
from msgspec import Struct

from backends.contract import BackendError, Line
from backends.link.client import keys_of
from backends.link.duty import beyond
from backends.link.messages import VERSION, About, Hello
from backends.link.sockets import check_line
from backends.link.trial.attempt import Attempt, Box, SkippedError, session
from backends.link.trial.probe import FailedError, Probe
from backends.link.trial.requirements import REQUIREMENTS, Requirement
from runner.site.values import Pose

BESIDE_M = 0.6
"""How far beside its way a robot may get that turns round on it."""

CONNECTING_S = 5.0


class Verdict(Enum):
    """What came of trying one requirement."""

    PASS = "pass"  # noqa: S105  a verdict, not a secret
    FAIL = "fail"
    NOT_TRIED = "not tried"


class Result(Struct, frozen=True):
    """One requirement tried. `why` is empty for a pass."""

    requirement: str
    text: str
    verdict: str
    why: str = ""


@dataclass(slots=True)
class Trial:
    """A robot on trial. Use it as a context: leaving it leaves no connection."""

    line: Line
    about: About
    context: zmq.Context[zmq.Socket[bytes]]

    @classmethod
    def begin(cls, line: Line) -> Trial:
        """Greet the robot. BackendError where it does not answer."""
        check_line(line.address, keys_of(line) is not None, line.insecure)
        context: zmq.Context[zmq.Socket[bytes]] = zmq.Context()
        probe = Probe(context, line)
        try:
            probe.wait_until_connected(CONNECTING_S)
            probe.send(Hello([VERSION]))
            about = probe.wait(About, seconds=5.0, what="`about`")
        except FailedError as failed:
            context.destroy(linger=0)
            raise BackendError(f"No trial of {line.address}. {failed}") from None
        probe.close()
        return cls(line, about, context)

    def close(self) -> None:
        self.context.destroy(linger=0)

    def box(self, ahead: float, speed: float) -> Box:
        """The way the robot is to be moved on: from where it stands to `ahead` meters ahead. BackendError where it does
        not say where it stands."""
        probe = Probe(self.context, self.line)
        try:
            probe.take(session())
            probe.until(lambda: bool(probe.telemetry), 5.0, "no telemetry came")
        except FailedError as failed:
            raise BackendError(f"The robot does not say where it stands. {failed}") from None
        finally:
            probe.close()
        start = probe.telemetry[-1].pose
        return Box(start, beyond(Pose(*start), (ahead, 0.0, 0.0)), min(speed, self._slow_enough(ahead)))

    def _slow_enough(self, ahead: float) -> float:
        """A speed at which half the way takes longer than a silence, so that the robot is seen to stop on its way."""
        return min(self.about.speed, ahead / 2.0 / (self.about.silence + 1.0))

    def run(
        self, box: Box | None, ask_restart: Callable[[], None] | None = None, only: Collection[int] = ()
    ) -> Iterator[Result]:
        """Try everything, or `only` some, in order; what moves the robot only with a box."""
        for requirement in REQUIREMENTS:
            if only and requirement.number not in only:
                continue
            if not self._ready():
                yield _result(requirement, Verdict.NOT_TRIED, "Nobody is there any more.")
            elif requirement.moves and box is None:
                yield _result(requirement, Verdict.NOT_TRIED, "It would move the robot.")
            else:
                yield self._try(requirement, box, ask_restart)

    def _try(self, requirement: Requirement, box: Box | None, ask_restart: Callable[[], None] | None) -> Result:
        probes: list[Probe] = []

        def connect() -> Probe:
            probes.append(Probe(self.context, self.line))
            return probes[-1]

        try:
            requirement.attempt(Attempt(connect, self.about, box, ask_restart))
        except FailedError as failed:
            return _result(requirement, Verdict.FAIL, str(failed))
        except SkippedError as skipped:
            return _result(requirement, Verdict.NOT_TRIED, str(skipped))
        finally:
            for probe in probes:
                probe.close()
        return _result(requirement, Verdict.PASS)

    def _ready(self) -> bool:
        """Wait for the lease, or for the end of its term, so that no attempt is spoiled by the one before it. False
        where nobody is there any more."""
        for _ in range(int(self.about.term) + 2):
            probe = Probe(self.context, self.line)
            try:
                probe.wait_until_connected(CONNECTING_S)
            except FailedError:
                probe.close()
                return False
            try:
                probe.take(session())
                return True
            except FailedError:
                continue
            finally:
                probe.close()
        return True


def _result(requirement: Requirement, verdict: Verdict, why: str = "") -> Result:
    return Result(requirement.name, requirement.text, verdict.value, why)


def box_in_words(box: Box) -> str:
    """Where the robot will be moved, for the person who is asked."""
    (x, y, heading), (ahead_x, ahead_y, _) = box.start, box.ahead
    length = ((ahead_x - x) ** 2 + (ahead_y - y) ** 2) ** 0.5
    reach = length + BESIDE_M
    return (
        f"It stands at {x:.2f}, {y:.2f}, heading {heading:.2f} rad. It will drive between there and a point\n"
        f"{length:.1f} m ahead, at no more than {box.speed:.2f} m/s, and turn round at both ends. Keep a box free\n"
        f"that reaches {reach:.1f} m ahead of it, and {BESIDE_M:.1f} m behind it and to both sides, measured from its\n"
        "center, and its own size more."
    )
