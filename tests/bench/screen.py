"""The watch screen on a real pseudo-terminal: what it sends, what it costs, how soon a key and an attach are seen.

A written drive is replayed, a view a quarter of a second: the robot moves, the route shrinks, sensed points change. The
bytes are those written to the terminal; nothing here compresses them. The share of a core is the process's own, from
proc(5). A key is one that opens or closes the abort prompt. Attaching is the real `trundle watch`, to a real run.
"""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import subprocess
import sys
import tempfile
import termios
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

from tests.bench.harness import Row, best_time

SECONDS = 10.0
SIZES = {(80, 24): ("3", "10"), (200, 60): ("12", "20")}
"""Columns and rows, with the goals in kB/s and percent of a core."""
KEYS = 60
LOOK = [sys.executable, "-m", "tests.screen.scripted"]
TRUNDLE = [sys.executable, "-c", "import sys; from runner.cli import main; sys.exit(main(sys.argv[1:]))"]


def measure() -> Iterator[Row]:
    for (columns, rows), goals in SIZES.items():
        for followed in (False, True):
            yield from _following(columns, rows, followed, goals)
    yield _key_to_paint()
    yield from _attaching()


@contextmanager
def _terminal(
    command: Sequence[str], columns: int = 80, rows: int = 24, **environment: str
) -> Iterator[tuple[int, int]]:
    """A program on a pseudo-terminal: its end of ours, and its process id."""
    ours, theirs = pty.openpty()
    fcntl.ioctl(theirs, termios.TIOCSWINSZ, struct.pack("HHHH", rows, columns, 0, 0))
    process = subprocess.Popen(
        command,
        stdin=theirs,
        stdout=theirs,
        stderr=theirs,
        env={**os.environ, "TERM": "xterm-256color", "LANG": "C.UTF-8", **environment},
        start_new_session=True,
    )
    os.close(theirs)
    try:
        yield ours, process.pid
    finally:
        process.send_signal(signal.SIGKILL)
        process.wait()
        os.close(ours)


def _read(terminal: int, seconds: float, until: bytes = b"") -> bytes:
    """What is written in so many seconds, or up to a text."""
    data, end = b"", time.monotonic() + seconds
    while (left := end - time.monotonic()) > 0.0 and not (until and until in data):
        if select.select([terminal], [], [], left)[0]:
            data += os.read(terminal, 65536)
    return data


def _used(process_id: int) -> float:
    """Seconds of processor time that a process has used (proc(5): utime and stime)."""
    fields = Path(f"/proc/{process_id}/stat").read_text().rsplit(")", 1)[1].split()
    return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")


def _following(columns: int, rows: int, followed: bool, goals: tuple[str, str]) -> Iterator[Row]:
    with _terminal([*LOOK, "driving"], columns, rows) as (terminal, process_id):
        _read(terminal, 20.0, until=b"leave")
        if followed:
            os.write(terminal, b"f+")
        _read(terminal, 1.5)
        used, begun = _used(process_id), time.monotonic()
        sent = len(_read(terminal, SECONDS))
        took = time.monotonic() - begun
        used = _used(process_id) - used
    name = f"screen, {columns} x {rows}, {'followed closely' if followed else 'whole floor'}"
    yield Row(f"{name}: bytes", sent / took / 1000.0, "kB/s", goal=f"under {goals[0]}")
    yield Row(f"{name}: core", 100.0 * used / took, "%", goal=f"under {goals[1]}")


def _key_to_paint() -> Row:
    times = []
    with _terminal([*LOOK, "moving"]) as (terminal, _):
        _read(terminal, 20.0, until=b"leave")
        for number in range(KEYS):
            _read(terminal, 0.1)
            begun = time.perf_counter()
            os.write(terminal, b"n" if number % 2 else b"a")
            _read(terminal, 5.0, until=b"skip" if number % 2 else b"Abort the run")
            times.append(1000.0 * (time.perf_counter() - begun))
    return Row("screen: key to paint, p95", sorted(times)[int(0.95 * KEYS)], "ms", goal="under 80")


def _attaching() -> Iterator[Row]:
    with tempfile.TemporaryDirectory() as runs:
        environment = {**os.environ, "TRUNDLE_RUNS": runs}
        subprocess.run([*TRUNDLE, "run", "evening-round", "--detach"], env=environment, check=True, capture_output=True)
        try:
            ours = min(_first_paint(runs) for _ in range(3))
        finally:
            subprocess.run([*TRUNDLE, "abort"], env=environment, check=False, capture_output=True)
    peer = best_time(lambda: subprocess.run([sys.executable, "-c", "import textual.app"], check=True), 3)
    yield Row("screen: attach to first paint", ours, "s", "importing textual.app", peer, ours / peer, "under 1.2 s")


def _first_paint(runs: str) -> float:
    begun = time.perf_counter()
    with _terminal([*TRUNDLE, "watch"], TRUNDLE_RUNS=runs) as (terminal, _):
        _read(terminal, 20.0, until=b"M O V I N G")
        return time.perf_counter() - begun
