"""From a person's abort to the halt on the wire, beside a bare pyzmq echo, with telemetry at 50 Hz and three watchers.

The robot is a process of its own and writes down when the halt came; both processes read the same monotonic clock. Each
abort ends a run, so each has a host of its own, started as the tests of faults start theirs.
"""

from __future__ import annotations

import contextlib
import os
import statistics
import tempfile
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import zmq

from runner.host.messages import Deed
from runner.host.remote import RemoteSource, do
from tests.bench.harness import Row
from tests.faults.hosts import nursery, until_up

ABORTS = int(os.environ.get("TRUNDLE_BENCH_ABORTS", "1000"))


def measure() -> Iterator[Row]:
    with tempfile.TemporaryDirectory() as name:
        ours = sorted(abort_times(Path(name), ABORTS))
        echo = sorted(echo_times(Path(name) / "echo", ABORTS))
    yield row("abort to halt, median", statistics.median(ours), statistics.median(echo), "")
    yield row("abort to halt, 99th percentile", ours[len(ours) * 99 // 100], echo[len(echo) * 99 // 100], "under 20 ms")


def row(name: str, ours: float, echo: float, goal: str) -> Row:
    return Row(name, ours * 1e3, "ms", "bare pyzmq echo, new socket", echo * 1e3, ours / echo, goal)


def abort_times(folder: Path, count: int) -> Iterator[float]:
    with nursery(folder, factor=1.0) as nursed:
        for number in range(count):
            run = folder / str(number)
            host = nursed.begin(run)
            until_up(run)
            with contextlib.ExitStack() as watching:
                for _ in range(3):
                    watching.enter_context(RemoteSource(run))
                begun = time.monotonic()
                do(run, Deed.ABORT)
            nursed.wait(host)
            halts = [
                note["time"] for note in nursed.robots_account() if note["what"] == "halt" and note["time"] > begun
            ]
            yield halts[0] - begun


def echo_times(path: Path, count: int) -> Iterator[float]:
    """A new socket for each, as the command that aborts has."""
    thread = threading.Thread(target=echo, args=(path, count), daemon=True)
    thread.start()
    time.sleep(0.2)
    for _ in range(count):
        context = zmq.Context()
        begun = time.monotonic()
        with context.socket(zmq.DEALER) as socket:
            socket.connect(f"ipc://{path}")
            socket.send(b"x" * 120)
            socket.recv()
            yield time.monotonic() - begun
        context.term()


def echo(path: Path, count: int) -> None:
    context = zmq.Context()
    with context.socket(zmq.ROUTER) as socket:
        socket.bind(f"ipc://{path}")
        for _ in range(count):
            socket.send_multipart(socket.recv_multipart())
        time.sleep(0.2)
    context.term()
