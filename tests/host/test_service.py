"""What a service manager is told, on a real socket."""

from __future__ import annotations

import socket
from pathlib import Path

import pytest

from runner.host.service import ServiceManager


@pytest.mark.parametrize("abstract", [False, True])
def test_it_is_told_that_the_run_is_ready_alive_and_stopping(tmp_path: Path, abstract: bool) -> None:
    name = f"@trundle-test-{tmp_path.name}" if abstract else str(tmp_path / "notify")
    with socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM) as manager:
        manager.bind("\0" + name[1:] if abstract else name)
        manager.settimeout(5.0)
        service = ServiceManager({"NOTIFY_SOCKET": name, "WATCHDOG_USEC": "60000000"})
        service.ready()
        service.alive()
        service.alive()  # too early to be told again
        service.stopping()
        assert [manager.recv(100) for _ in range(3)] == [b"READY=1", b"WATCHDOG=1", b"STOPPING=1"]
        manager.setblocking(False)
        with pytest.raises(BlockingIOError):
            manager.recv(100)


def test_without_a_manager_or_with_a_dead_one_nothing_happens(tmp_path: Path) -> None:
    ServiceManager({}).ready()
    ServiceManager({"NOTIFY_SOCKET": str(tmp_path / "gone")}).ready()
    other = ServiceManager({"NOTIFY_SOCKET": str(tmp_path / "gone"), "WATCHDOG_USEC": "1", "WATCHDOG_PID": "1"})
    other.alive()
