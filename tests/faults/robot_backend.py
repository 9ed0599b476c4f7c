"""The backend for `robot_process`: the contract over a Unix socket. Where the robot is comes from the environment."""

from __future__ import annotations

import json
import os
import select
import socket
import time
from collections.abc import Sequence
from datetime import datetime, timedelta
from typing import Any

from backends.contract import (
    ActionReport,
    BackendError,
    Capability,
    Clock,
    Goal,
    GoalReport,
    GoalStatus,
    Report,
    Setup,
    Telemetry,
)
from runner.site.values import Pose

ADDRESS, FACTOR = "TRUNDLE_FAULTS_ROBOT", "TRUNDLE_FAULTS_FACTOR"


class FastClock:
    """Monotonic time, some times as fast as the wall's; its own wall clock goes along."""

    virtual = False

    def __init__(self, factor: float) -> None:
        self._factor = factor
        self._began = time.monotonic()
        self._wall = datetime.now()

    def now(self) -> float:
        return (time.monotonic() - self._began) * self._factor

    def wall(self) -> datetime:
        return self._wall + timedelta(seconds=self.now())


class RobotClient:
    """A robot in another process."""

    capabilities = frozenset({Capability.CLEAR, Capability.REPLAN, Capability.EASE_BACK})

    def __init__(self, address: str, factor: float) -> None:
        self._address = address
        self._factor = factor
        self._clock = FastClock(factor)
        self._socket = socket.socket(socket.AF_UNIX, socket.SOCK_STREAM)
        self._incoming = b""
        self._driven_before: float | None = None

    @property
    def clock(self) -> Clock:
        return self._clock

    def preparation(self) -> str:
        return ""

    def open(self) -> None:
        self._socket.connect(self._address)
        self._socket.setblocking(False)
        self._clock = FastClock(self._factor)

    def go(self, goal: Goal) -> None:
        pose = [goal.pose.x, goal.pose.y, goal.pose.heading]
        self._send({"goal": goal.id, "pose": pose, "speed": goal.speed})

    def halt(self) -> None:
        self._send({"halt": True})

    def clear(self, action_id: int, radius: float) -> None:
        self._send({"action": action_id, "what": "clear", "amount": radius})

    def replan(self, action_id: int) -> None:
        self._send({"action": action_id, "what": "replan"})

    def ease_back(self, action_id: int, distance: float) -> None:
        self._send({"action": action_id, "what": "ease back", "amount": distance})

    def relocate(self, action_id: int, _pose: Pose | None) -> None:
        self._send({"action": action_id, "what": "relocate"})

    def charge(self) -> None:
        """This robot has no battery."""

    def reports(self, until: float) -> Sequence[Report]:
        wait = max(until - self._clock.now(), 0.0) / self._factor
        if not select.select([self._socket], [], [], wait)[0]:
            return []
        data = self._socket.recv(65536)
        if not data:
            raise BackendError("The robot has closed the line.")
        *lines, self._incoming = (self._incoming + data).split(b"\n")
        return [self._report(json.loads(line)) for line in lines]

    def close(self) -> None:
        self._socket.close()

    def _report(self, said: dict[str, Any]) -> Report:
        now = self._clock.now()
        if "status" in said:
            return GoalReport(now, said["id"], GoalStatus(said["status"]))
        if "action" in said:
            return ActionReport(now, said["action"], said["done"])
        if self._driven_before is None:
            self._driven_before = said["driven"]
        return Telemetry(
            stamp=now,
            pose=Pose(*said["pose"]),
            spread=0.02,
            speed=0.0 if said["remaining"] is None else 0.8,
            turn_rate=0.0,
            battery=0.9,
            driven=said["driven"] - self._driven_before,
            remaining=said["remaining"],
            route_number=said["goal"],
            route=() if said["remaining"] is None else ((said["pose"][0], said["pose"][1]),),
            obstacles=(),
        )

    def _send(self, command: dict[str, Any]) -> None:
        try:
            self._socket.sendall(json.dumps(command).encode() + b"\n")
        except OSError as error:
            raise BackendError(f"The robot cannot be reached: {error.strerror}.") from error


def create(setup: Setup) -> RobotClient:
    """The robot that the environment names."""
    return RobotClient(os.environ[ADDRESS], float(os.environ.get(FACTOR, "1")))
