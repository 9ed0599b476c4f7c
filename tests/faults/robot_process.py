"""A robot as a process of its own, which outlives the program that drives it: `python -m tests.faults.robot_process`.

It speaks the backend's contract as lines of JSON over a Unix socket, to one controller at a time, and goes on with what
it does while there is none. It writes down every goal it begins and every halt, with the time, so that a test can ask
what was really driven. It drives in straight lines, in a time that runs `factor` times as fast as the wall's.

    {"goal": 3, "pose": [x, y, heading], "speed": 0.8}   {"halt": true}   {"action": 5, "what": "replan"}
"""

from __future__ import annotations

import contextlib
import json
import math
import os
import select
import signal
import socket
import sys
import time
from pathlib import Path
from typing import Any

STEP_S = 0.01
"""Wall seconds between two looks at the world."""
TELEMETRY_S = 0.02
"""Wall seconds between two telemetry reports: 50 a second."""


class RobotProcess:
    """One robot at one socket. With `trouble`, some goals have no route at first and some are stuck till replanned."""

    def __init__(self, path: Path, log: Path, factor: float, trouble: bool) -> None:
        self._listener = socket.socket(socket.AF_UNIX, socket.SOCK_STREAM)
        self._listener.bind(str(path))
        self._listener.listen(4)
        self._controller: socket.socket | None = None
        self._incoming = b""
        self._log = log.open("a")
        self._factor = factor
        self._trouble = trouble
        self._pose = [1.5, 1.5, 0.0]
        self._driven = 0.0
        self._goal: dict[str, Any] | None = None
        self._last_id = 0
        self._last_status: dict[str, Any] | None = None
        self._stuck = False

    def serve(self) -> None:
        before, next_telemetry = time.monotonic(), 0.0
        while True:
            watched = [self._listener] + ([self._controller] if self._controller else [])
            ready, _, _ = select.select(watched, [], [], STEP_S)
            if self._listener in ready:
                self._welcome()
            if self._controller in ready:
                self._listen()
            now = time.monotonic()
            self._drive((now - before) * self._factor)
            before = now
            if now >= next_telemetry:
                next_telemetry = now + TELEMETRY_S
                self._say(self._telemetry())

    def _welcome(self) -> None:
        controller, _ = self._listener.accept()
        if self._controller is not None:
            self._controller.close()
        self._controller, self._incoming = controller, b""
        controller.setblocking(False)

    def _listen(self) -> None:
        assert self._controller is not None
        try:
            data = self._controller.recv(65536)
        except OSError:
            data = b""
        if not data:
            self._controller.close()
            self._controller = None
            return
        *lines, self._incoming = (self._incoming + data).split(b"\n")
        for line in lines:
            self._obey(json.loads(line))

    def _obey(self, command: dict[str, Any]) -> None:
        if "goal" in command:
            self._go(command)
        elif "halt" in command:
            self._note("halt", self._goal["goal"] if self._goal else 0)
            self._end("halted")
        elif "action" in command:
            self._stuck = False
            self._note(command["what"], command["action"])
            self._say({"action": command["action"], "done": True})

    def _go(self, command: dict[str, Any]) -> None:
        number = command["goal"]
        if number == self._last_id and self._last_status is not None:
            self._say(self._last_status)  # the same again changes nothing; where it stands is said again
        if number <= self._last_id:
            return
        self._last_id, self._goal = number, command
        self._note("begin", number)
        self._stuck = self._trouble and number % 4 == 3
        self._status("accepted")
        if self._trouble and number % 5 == 4:
            self._end("no route")

    def _drive(self, seconds: float) -> None:
        if self._goal is None or self._stuck:
            return
        x, y, heading = self._goal["pose"]
        left = math.hypot(x - self._pose[0], y - self._pose[1])
        step = min(self._goal["speed"] * seconds, left)
        self._driven += step
        if left - step < 1e-6:
            self._pose = [x, y, heading]
            self._end("arrived")
        else:
            self._pose[0] += (x - self._pose[0]) * step / left
            self._pose[1] += (y - self._pose[1]) * step / left

    def _end(self, status: str) -> None:
        if self._goal is not None:
            self._note(status, self._goal["goal"])
            self._status(status)
            self._goal = None

    def _status(self, status: str) -> None:
        assert self._goal is not None
        self._last_status = {"status": status, "id": self._goal["goal"]}
        self._say(self._last_status)

    def _telemetry(self) -> dict[str, Any]:
        remaining = None
        if self._goal is not None:
            x, y, _ = self._goal["pose"]
            remaining = math.hypot(x - self._pose[0], y - self._pose[1])
        return {"pose": self._pose, "driven": self._driven, "remaining": remaining, "goal": self._last_id}

    def _say(self, report: dict[str, Any]) -> None:
        if self._controller is not None:
            with contextlib.suppress(OSError):
                self._controller.send(json.dumps(report).encode() + b"\n")

    def _note(self, what: str, number: int) -> None:
        self._log.write(json.dumps({"what": what, "number": number, "time": time.monotonic()}) + "\n")
        self._log.flush()


def log_of(path: Path) -> list[dict[str, Any]]:
    """What a robot has written down."""
    return [json.loads(line) for line in path.read_text().splitlines()] if path.exists() else []


def main() -> None:
    path, log, factor, trouble = sys.argv[1:5]
    signal.signal(signal.SIGTERM, lambda *_: os._exit(0))
    RobotProcess(Path(path), Path(log), float(factor), trouble == "trouble").serve()


if __name__ == "__main__":
    main()
