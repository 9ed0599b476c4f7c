"""What trying a requirement has at hand: connections, the box in which the robot may move, and goals under way."""

from __future__ import annotations

import secrets
from collections.abc import Callable
from dataclasses import dataclass
from math import hypot
from zlib import crc32

from backends.link.messages import About, Stand
from backends.link.trial.probe import FailedError, Probe


class SkippedError(Exception):
    """The requirement cannot be tried on this robot, in a sentence."""


@dataclass(slots=True)
class Box:
    """Where the robot is moved: between where it stood and a point ahead of it. `speed` in m/s."""

    start: Stand
    ahead: Stand
    speed: float
    goal: int = 0

    def far(self, pose: Stand) -> Stand:
        """The end of the way that is farther from here."""
        return max((self.start, self.ahead), key=lambda end: hypot(end[0] - pose[0], end[1] - pose[1]))


@dataclass(slots=True)
class Attempt:
    """What an attempt has at hand."""

    connect: Callable[[], Probe]
    about: About
    box: Box | None
    ask_restart: Callable[[], None] | None = None

    def leased(self) -> Probe:
        """A new connection that holds the lease for a new session."""
        probe = self.connect()
        probe.take(session())
        return probe

    def driving(self) -> tuple[Probe, int, Stand]:
        """A connection whose goal is under way, the robot in motion; the goal and its pose."""
        assert self.box is not None
        probe = self.leased()
        probe.until(lambda: bool(probe.telemetry), 2.0, "no telemetry came")
        self.box.goal += 1
        pose = self.box.far(probe.telemetry[-1].pose)
        outcome = probe.go(self.box.goal, pose, self.box.speed)
        if outcome != "taken":
            raise FailedError(f"A goal was answered `{outcome}`, not `taken`.")
        driven = probe.telemetry[-1].driven
        probe.until(lambda: probe.telemetry[-1].driven > driven + 0.05, 15.0, "the robot did not begin to move")
        return probe, self.box.goal, pose


def session() -> str:
    """A session that nobody had."""
    return f"trial-{secrets.token_hex(8)}"


def framed(body: bytes) -> bytes:
    """A frame of any bytes."""
    return crc32(body).to_bytes(4, "big") + body
