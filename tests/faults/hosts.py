"""What the tests of faults share: a robot in its own process, and hosts that can be killed and started again."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from runner.host.remote import UnreachableError, look
from tests.faults.robot_backend import ADDRESS, FACTOR
from tests.faults.robot_process import log_of


@dataclass(slots=True)
class Nursery:
    """A robot and the cradle of its hosts."""

    cradle: subprocess.Popen[str]
    robot: subprocess.Popen[bytes]
    robot_log: Path

    def begin(self, folder: Path) -> int:
        return int(self._ask(f"begin {folder}"))

    def pick_up(self, folder: Path) -> int:
        return int(self._ask(f"pick-up {folder}"))

    def kill(self, host: int) -> int:
        """Kill it as the system would kill it when it is out of memory; its exit status."""
        os.kill(host, signal.SIGKILL)
        return self.wait(host)

    def wait(self, host: int) -> int:
        return int(self._ask(f"wait {host}"))

    def robots_account(self) -> list[dict[str, Any]]:
        return log_of(self.robot_log)

    def _ask(self, line: str) -> str:
        assert self.cradle.stdin is not None
        assert self.cradle.stdout is not None
        self.cradle.stdin.write(line + "\n")
        self.cradle.stdin.flush()
        return self.cradle.stdout.readline()


@contextmanager
def nursery(folder: Path, factor: float = 20.0, laps: int = 2, trouble: bool = False) -> Iterator[Nursery]:
    """A robot that is up, and a cradle that is ready."""
    address, log = folder / "r", folder / "robot.log"
    words = [str(address), str(log), str(factor), "trouble" if trouble else "smooth"]
    robot = subprocess.Popen([sys.executable, "-m", "tests.faults.robot_process", *words])
    environment = {**os.environ, ADDRESS: str(address), FACTOR: str(factor)}
    cradle = subprocess.Popen(
        [sys.executable, "-m", "tests.faults.cradle", str(laps)],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
        env=environment,
    )
    try:
        assert cradle.stdout is not None
        assert cradle.stdout.readline() == "ready\n"
        yield Nursery(cradle, robot, log)
    finally:
        for process in (cradle, robot):
            process.kill()
            process.wait()
        for pipe in (cradle.stdin, cradle.stdout):
            if pipe is not None:
                pipe.close()


def until_up(folder: Path, seconds: float = 20.0) -> None:
    """Wait until a host answers and its robot has been heard."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        try:
            view = look(folder).view
        except UnreachableError:
            view = None
        if view is not None and view.pose is not None:
            return
        time.sleep(0.01)
    raise AssertionError(f"the host of {folder} did not come up")
