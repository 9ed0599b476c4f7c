"""The link on real sockets: who is admitted, addresses that are refused, and the backend as the host uses it."""

from __future__ import annotations

import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest

from backends.contract import BackendError, Capability, Goal, GoalReport, GoalStatus, Line, OnALine, Setup
from backends.link.adapter import Robot
from backends.link.client import LinkBackend
from backends.link.keys import make_pair, public_of, read_allowed, read_public, read_secret
from backends.link.server import Listening, RobotServer
from backends.link.sockets import Keys, check_address, check_line, on_this_computer
from runner.site.values import Conditions, Pose
from tests.backends.link.toy import ABILITIES, PointRobot
from tests.builders import ROBOT, hall

TRUNDLE = [sys.executable, "-c", "from runner.cli import main; raise SystemExit(main())"]


@pytest.fixture
def folder() -> Iterator[Path]:
    """A folder with a path that is short enough for a socket, and three pairs of keys."""
    with TemporaryDirectory(prefix="tls") as name:
        for who in ("robot", "host", "stranger"):
            make_pair(Path(name), who)
        yield Path(name)


@contextmanager
def served(folder: Path, robot: Robot | None = None, keyed: bool = True) -> Iterator[tuple[str, PointRobot]]:
    """A point robot, served in a thread; its address and itself."""
    secret = read_secret(folder / "robot.secret")
    address = f"ipc://{folder}/socket"
    keys = Keys(secret, public_of(secret)) if keyed else None
    allowed = read_allowed(folder / "host.public") if keyed else {}
    point = PointRobot(time.monotonic, robot)
    server = RobotServer(point, Listening(address, keys, allowed), time.monotonic)
    stopped = threading.Event()
    thread = threading.Thread(target=server.run, args=(stopped,))
    thread.start()
    try:
        yield address, point
    finally:
        stopped.set()
        thread.join()


def setup(line: Line | None) -> Setup:
    return Setup(hall(), ROBOT, Pose(0.0, 0.0, 0.0), Conditions(), 1, datetime(2026, 1, 5), line)


def line(folder: Path, address: str, who: str = "host") -> Line:
    return Line(address, "a run", str(folder / f"{who}.secret"), str(folder / "robot.public"))


def test_a_goal_is_driven_over_a_keyed_line_and_the_backend_knows_the_robots_abilities(folder: Path) -> None:
    with served(folder) as (address, point):
        backend = LinkBackend(setup(line(folder, address)))
        assert backend.capabilities == frozenset(Capability)
        assert backend.preparation().startswith("Taking control of the robot at ipc://")
        backend.open()
        backend.go(Goal(1, Pose(0.4, 0.0, 0.0), 1.0))
        ends = []
        while not ends and backend.clock.now() < 20.0:
            news = backend.reports(backend.clock.now() + 0.1)
            ends = [report for report in news if isinstance(report, GoalReport) and report.status is GoalStatus.ARRIVED]
        assert ends
        quality = backend.quality
        assert isinstance(backend, OnALine)
        assert quality.round_trip is not None
        assert quality.offset_error is not None
        assert 0.0 < quality.offset_error <= quality.round_trip / 2.0 + 1e-9
        assert quality.answered == 1.0
        backend.close()
        backend.close()
    assert len(point.drives) == 1


def test_a_key_that_is_not_on_the_list_is_told_so_in_words(folder: Path) -> None:
    with served(folder) as (address, _):
        backend = LinkBackend(setup(line(folder, address, "stranger")))
        with pytest.raises(BackendError, match="does not admit this key"):
            backend.open()


def test_nobody_at_an_address_is_said_in_words(folder: Path) -> None:
    backend = LinkBackend(setup(Line(f"ipc://{folder}/nobody")))
    with pytest.raises(BackendError, match="No robot answers at ipc://"):
        backend.capabilities  # noqa: B018  the question is what matters


def test_a_robot_on_another_site_is_not_driven(folder: Path) -> None:
    elsewhere = Robot("point", ABILITIES, 1.0, site="somewhere else")
    with (
        served(folder, elsewhere, keyed=False) as (address, _),
        pytest.raises(BackendError, match='on the site "somewhere else", the mission is for "hall"'),
    ):
        LinkBackend(setup(Line(address))).open()


@pytest.mark.parametrize(
    "address", ["", "robot", "tcp://robot", "tcp://robot:0", "tcp://robot:99999", "udp://a:1", "ipc://"]
)
def test_what_is_no_address_is_refused(address: str) -> None:
    with pytest.raises(BackendError):
        check_address(address)


def test_plain_text_stays_on_this_computer_unless_somebody_asks_for_it() -> None:
    assert all(map(on_this_computer, ("ipc:///tmp/x", "tcp://127.0.0.1:7", "tcp://localhost:7", "tcp://[::1]:7")))
    assert not any(map(on_this_computer, ("tcp://192.0.2.1:7", "tcp://0.0.0.0:7", "tcp://localhost.example:7")))
    with pytest.raises(BackendError, match="trundle link keys"):
        check_line("tcp://192.0.2.1:7410", has_keys=False, insecure=False)
    check_line("tcp://192.0.2.1:7410", has_keys=True, insecure=False)
    check_line("tcp://192.0.2.1:7410", has_keys=False, insecure=True)


def test_keys_are_written_for_their_owner_only_and_never_over_others(folder: Path) -> None:
    assert (folder / "host.secret").stat().st_mode & 0o777 == 0o600
    with pytest.raises(BackendError, match="is there already"):
        make_pair(folder, "host")
    (folder / "host.secret").chmod(0o640)
    with pytest.raises(BackendError, match="chmod 600"):
        read_secret(folder / "host.secret")
    with pytest.raises(BackendError, match=r"The public one is host\.public"):
        read_public(folder / "host.secret")
    (folder / "bad.public").write_text("no key\n")
    with pytest.raises(BackendError, match="holds no key"):
        read_allowed(folder)


def test_no_secret_shows_when_keys_or_lines_are_printed(folder: Path) -> None:
    secret = (folder / "host.secret").read_text().strip()
    keys = Keys(read_secret(folder / "host.secret"), b"p" * 40)
    assert secret not in repr(keys)
    assert secret not in repr(line(folder, "ipc:///x"))


def test_the_keys_command_says_what_goes_where(tmp_path: Path) -> None:
    command = [*TRUNDLE, "link", "keys", "cart-3", "--in", str(tmp_path / "keys")]
    done = subprocess.run(command, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0
    assert "goes to the other side" in done.stdout
    assert (tmp_path / "keys").stat().st_mode & 0o777 == 0o700
    assert (tmp_path / "keys" / "cart-3.secret").read_text().strip() not in done.stdout
    assert subprocess.run(command, capture_output=True, timeout=60, check=False).returncode == 2


def test_a_run_on_a_robot_beyond_this_computer_asks_first_and_says_what_it_is_not() -> None:
    command = [*TRUNDLE, "run", "short-errand", "--plain", "--robot", "tcp://192.0.2.1:7410", "--insecure-line"]
    done = subprocess.run(command, capture_output=True, text=True, timeout=120, check=False, stdin=subprocess.DEVNULL)
    assert done.returncode == 2
    assert "no safety device" in done.stderr
    assert "--area-clear" in done.stderr
    assert "Nothing was driven." in done.stderr


def test_a_look_takes_no_control(folder: Path) -> None:
    with served(folder, keyed=False) as (address, point):
        command = [*TRUNDLE, "link", "look", address, "--seconds", "0.5"]
        done = subprocess.run(command, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0, done.stderr
    assert "point, at most 1 m/s" in done.stdout
    assert "answered" in done.stdout
    assert point.stops <= 1  # only at the end of its program


def test_one_key_of_two_is_not_enough(folder: Path) -> None:
    with pytest.raises(BackendError, match="two files"):
        LinkBackend(setup(replace(line(folder, "ipc:///x"), robot_key_file="")))
