"""The link beside a bare ZeroMQ echo: same computer, same security, same bytes, taking turns in the same minute.

Ours does what a command needs: it is numbered, checked and served under the lease, and its answer is read and matched.
The command is `charge`, which changes nothing that a `state` would tell, so that its own two frames are all there is.
The echo sends the same frame and gets one of the answer's size back. Both have the other side in a process of its own,
over tcp on loopback, and run where the system puts them, as in use. What ours adds is some 50 us of arithmetic; what it
saves is one sleep, because it looks for an answer for half a millisecond before it falls asleep.
An abort is timed at the robot: from the call in the host's process to the adapter's `stop`, on one clock.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from statistics import median

import zmq

from backends.contract import Goal, Line, Setup
from backends.link.client import LinkBackend, keys_of
from backends.link.keys import make_pair
from backends.link.messages import Charge, encode
from backends.link.sockets import controller_socket
from runner.site.values import Conditions, Pose
from tests.bench.harness import Row
from tests.builders import ROBOT, hall
from tests.faults.line_proxy import free_port

ROUNDS, TRIPS, ABORTS = 20, 250, 300
TELEMETRY_S = 20.0

SERVER = """
import sys, threading
from tests.bench.link import serve
serve(*sys.argv[1:])
"""
ECHO = """
import sys
from tests.bench.link import echo
echo(*sys.argv[1:])
"""


def measure() -> Iterator[Row]:
    for security in ("plain", "curve"):
        with tempfile.TemporaryDirectory(prefix="tlk") as name:
            yield from round_trips(Path(name), security)
    with tempfile.TemporaryDirectory(prefix="tlk") as name:
        yield from aborts(Path(name))
    with tempfile.TemporaryDirectory(prefix="tlk") as name:
        yield from telemetry(Path(name))


# --- the other side, in processes of its own


def serve(folder: str, address: str, security: str, log: str) -> None:
    """A robot that is a point, and that notes when it was stopped."""
    import threading

    from backends.link.keys import public_of, read_allowed, read_secret
    from backends.link.server import Listening, RobotServer
    from backends.link.sockets import Keys
    from tests.backends.link.toy import PointRobot

    class Noting(PointRobot):
        def stop(self) -> None:
            with open(log, "a", encoding="utf-8") as file:
                file.write(f"{time.monotonic_ns()}\n")
            PointRobot.stop(self)

    listening = Listening(address)
    if security == "curve":
        secret = read_secret(Path(folder) / "robot.secret")
        listening = Listening(address, Keys(secret, public_of(secret)), read_allowed(Path(folder) / "host.public"))
    began = time.monotonic()
    clock = lambda: time.monotonic() - began  # noqa: E731
    RobotServer(Noting(clock), listening, clock).run(threading.Event())


def echo(folder: str, address: str, security: str, answer_bytes: str) -> None:
    """A bare ROUTER that answers each message with so many bytes."""
    from backends.link.gate import Gate
    from backends.link.keys import public_of, read_allowed, read_secret
    from backends.link.sockets import Keys, robot_socket

    context: zmq.Context[zmq.Socket[bytes]] = zmq.Context()
    keys, gate = None, None
    if security == "curve":
        secret = read_secret(Path(folder) / "robot.secret")
        keys, gate = Keys(secret, public_of(secret)), Gate(context, read_allowed(Path(folder) / "host.public"))
    socket, body = robot_socket(context, address, keys), b"x" * int(answer_bytes)
    poller = zmq.Poller()
    poller.register(socket, zmq.POLLIN)
    if gate is not None:
        poller.register(gate.socket, zmq.POLLIN)
    while True:
        for ready, _ in poller.poll():
            if ready is socket:
                peer, _ = socket.recv_multipart()
                socket.send_multipart((peer, body))
            elif gate is not None:
                gate.turn()


@contextmanager
def other_side(script: str, *arguments: str) -> Iterator[subprocess.Popen[bytes]]:
    process = subprocess.Popen([sys.executable, "-c", script, *arguments])
    try:
        yield process
    finally:
        process.kill()
        process.wait()


@dataclass
class Ends:
    """Our two ends of the measurement."""

    backend: LinkBackend

    def trip(self) -> None:
        """One command, until its answer is matched."""
        self.backend.charge()
        controller = self.backend.controller
        while not controller.settled:
            self.backend._wait(1.0)
            self.backend._receive()


def line(folder: Path, address: str, security: str) -> Line:
    if security == "plain":
        return Line(address)
    return Line(address, key_file=str(folder / "host.secret"), robot_key_file=str(folder / "robot.public"))


def opened(folder: Path, address: str, security: str) -> LinkBackend:
    setup = Setup(
        hall(), ROBOT, Pose(0.0, 0.0, 0.0), Conditions(), 1, datetime(2026, 1, 5), line(folder, address, security)
    )
    backend = LinkBackend(setup)
    backend.open()
    return backend


def prepared(folder: Path) -> tuple[str, str]:
    make_pair(folder, "robot")
    make_pair(folder, "host")
    return f"tcp://127.0.0.1:{free_port()}", f"tcp://127.0.0.1:{free_port()}"


def round_trips(folder: Path, security: str) -> Iterator[Row]:
    ours, bare = prepared(folder)
    frame = encode(Charge("0" * 32, 100, 12.345678901))
    answer = 4 + len(b'{"kind":"done","number":100,"outcome":"taken","reason":""}')
    with (
        other_side(SERVER, str(folder), ours, security, os.devnull),
        other_side(ECHO, str(folder), bare, security, str(answer)),
    ):
        ends = Ends(opened(folder, ours, security))
        context: zmq.Context[zmq.Socket[bytes]] = zmq.Context()
        socket = controller_socket(context, bare, keys_of(line(folder, bare, security)))
        socket.poll(5000, zmq.POLLOUT)

        def echoed() -> None:
            socket.send(frame)
            socket.poll(1000)
            socket.recv()

        ours_times, bare_times = [], []
        for _ in range(ROUNDS):
            ours_times.append(timed(ends.trip))
            bare_times.append(timed(echoed))
        ends.backend.close()
        context.destroy(linger=0)
    for share, goal in ((0.5, "1.3"), (0.99, "2")):
        values = [quantile(times, share) * 1e6 for times in ours_times]
        peers = [quantile(times, share) * 1e6 for times in bare_times]
        ratio = median(value / peer for value, peer in zip(values, peers, strict=True))
        name = f"link, command round trip, {security}, p{share * 100:.0f}"
        yield Row(name, median(values), "us", "bare echo, same round", median(peers), ratio, goal)


def timed(action: Callable[[], None]) -> list[float]:
    found = []
    for _ in range(TRIPS):
        begun = time.perf_counter()
        action()
        found.append(time.perf_counter() - begun)
    return found


def quantile(values: list[float], share: float) -> float:
    return sorted(values)[min(len(values) - 1, int(share * len(values)))]


def aborts(folder: Path) -> Iterator[Row]:
    """From `halt` in the host's process to the adapter's `stop`, with telemetry under way."""
    ours, _ = prepared(folder)
    log = folder / "stops"
    took = []
    with other_side(SERVER, str(folder), ours, "curve", str(log)):
        backend = opened(folder, ours, "curve")
        for number in range(1, ABORTS + 1):
            backend.go(Goal(number, Pose(50.0, 1.0, 0.0), 0.001))
            pump(backend, 0.02)
            begun = time.monotonic_ns()
            backend.halt()
            while not (stops := [stop for stop in stopped_at(log) if stop >= begun]):
                pump(backend, 0.02)
            took.append((min(stops) - begun) / 1e9)
        backend.close()
    for share in (0.5, 0.99):
        yield Row(
            f"link, halt to the adapter's stop, curve, p{share * 100:.0f}",
            quantile(took, share) * 1e3,
            "ms",
            goal="under 20 ms at p99",
        )


def stopped_at(log: Path) -> list[int]:
    """When the adapter was told to stop, on the monotonic clock, nanoseconds."""
    return [int(text) for text in log.read_text(encoding="utf-8").split()] if log.exists() else []


def pump(backend: LinkBackend, seconds: float) -> None:
    end = backend.clock.now() + seconds
    while backend.clock.now() < end:
        backend.reports(end)


def telemetry(folder: Path) -> Iterator[Row]:
    """The share of a core that a host spends on telemetry at 100 Hz, and the robot's side for comparison."""
    ours, _ = prepared(folder)
    with other_side(SERVER, str(folder), ours, "curve", os.devnull) as server:
        backend = opened(folder, ours, "curve")
        backend.controller._every = 0.01
        backend.controller._window = 50
        backend.controller._lease = None  # ask again, with another interval
        pump(backend, 1.0)
        begun, before, other = time.monotonic(), time.process_time(), cpu_seconds(server.pid)
        count = 0
        while time.monotonic() - begun < TELEMETRY_S:
            count += len(backend.reports(backend.clock.now() + 0.1))
        wall = time.monotonic() - begun
        share, robot = (time.process_time() - before) / wall, (cpu_seconds(server.pid) - other) / wall
        backend.close()
    yield Row("link, telemetry that came", count / wall, "a second", goal="100")
    yield Row("link, telemetry, the host's share of a core", share * 100, "%", goal="under 5 %")
    yield Row("link, telemetry, the robot's side's share", robot * 100, "%")


def cpu_seconds(process: int) -> float:
    fields = Path(f"/proc/{process}/stat").read_text(encoding="utf-8").rsplit(")", 1)[1].split()
    return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")
