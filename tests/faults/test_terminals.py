"""A run outlives the terminal it was started from, on real pseudo-terminals."""

from __future__ import annotations

import contextlib
import fcntl
import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from runner.cli.exits import Exit
from runner.engine.values import Go
from runner.host.messages import Deed
from runner.host.remote import UnreachableError, do, look
from runner.host.view import Health
from runner.journal.errors import JournalError
from runner.journal.outcome import RunOutcome, outcome_of
from runner.journal.reader import Status, open_record
from runner.journal.runs import find_run
from runner.journal.schema import FILE_NAME
from tests.screen.test_real_terminal import Terminal

TRUNDLE = Path(sys.executable).parent / "trundle"


@contextmanager
def command(runs: Path, *words: str) -> Iterator[tuple[Terminal, subprocess.Popen[bytes]]]:
    """The command on a terminal of its own, in a session of its own, as a login would have it."""
    terminal = Terminal(80, 24)
    process = subprocess.Popen(
        [str(TRUNDLE), *words],
        stdin=terminal.there,
        stdout=terminal.there,
        stderr=terminal.there,
        start_new_session=True,
        env={**os.environ, "TRUNDLE_RUNS": str(runs), "TERM": "xterm-256color"},
    )
    os.close(terminal.there)
    try:
        yield terminal, process
    finally:
        process.kill()
        process.wait()
        os.close(terminal.here)


def test_a_run_outlives_its_terminal_and_is_held_released_and_aborted_from_another(tmp_path: Path) -> None:
    with command(tmp_path, "run", "evening-round", "--pace", "2") as (terminal, process):
        terminal.read_until("on the way", 60.0)
        os.killpg(process.pid, signal.SIGKILL)
    folder = find_run(tmp_path)
    try:
        before = look(folder, 5.0).view
        time.sleep(1.0)
        after = look(folder, 5.0).view
        assert before is not None
        assert after is not None
        assert after.stamp > before.stamp
        watch_hold_release_and_abort(tmp_path, folder)
    finally:
        stop(folder)


def watch_hold_release_and_abort(runs: Path, folder: Path) -> None:
    with command(runs, "watch") as (terminal, process):
        terminal.read_until("on the way", 60.0)
        terminal.type(b"h")
        until(terminal, folder, held=True)
        terminal.type(b"r")
        until(terminal, folder, held=False)
        terminal.type(b"a")
        terminal.read(0.5)
        terminal.type(b"y")
        end = time.monotonic() + 20.0
        while outcome(folder) is not RunOutcome.ABORTED:
            assert time.monotonic() < end
            terminal.read(0.1)
        terminal.read_until("aborted")
        terminal.type(b"q")
        assert process.wait(20.0) == 5
    with open_record(folder) as record:
        acted = [(entry.value.action, entry.value.accepted) for entry in record.entries(names=("operator acted",))]  # type: ignore[union-attr]
        assert acted == [("hold", True), ("release", True), ("abort", True)]
        assert all("pts/" in entry.body for entry in record.entries(names=("operator acted",)))


def until(terminal: Terminal, folder: Path, held: bool) -> None:
    """Read the screen until the run is held, or no more."""
    end = time.monotonic() + 20.0
    while (look(folder, 5.0).view.health is Health.HELD) is not held:  # type: ignore[union-attr]
        assert time.monotonic() < end, terminal.text()
        terminal.read(0.1)
    terminal.read_until("release" if held else "hold ")  # the keys that mean something now


def outcome(folder: Path) -> RunOutcome:
    with open_record(folder) as record:
        return outcome_of(record)


def stop(folder: Path) -> None:
    try:
        do(folder, Deed.ABORT)
    except UnreachableError:
        return


def test_a_run_in_plain_lines_goes_on_while_nobody_reads_them(tmp_path: Path) -> None:
    """A pager that waits for a key, or a terminal that was stopped: the pipe is full, the run is not kept waiting."""
    reading, writing = os.pipe()
    fcntl.fcntl(writing, fcntl.F_SETPIPE_SZ, 4096)
    os.write(writing, b"-" * 4096)
    process = subprocess.Popen(
        [str(TRUNDLE), "run", "short-errand", "--pace", "max", "--plain"],
        stdout=writing,
        env={**os.environ, "TRUNDLE_RUNS": str(tmp_path)},
    )
    os.close(writing)
    try:
        assert the_run_ends(tmp_path, 60.0) is RunOutcome.ALL_ARRIVED
        assert process.poll() is None
        with open(reading, encoding="utf-8") as lines:
            assert "completed, every leg arrived" in lines.read()
        assert process.wait(10.0) == 0
    finally:
        process.kill()
        process.wait()


def the_run_ends(runs: Path, seconds: float) -> RunOutcome | None:
    """How the one run in there ended, None where it did not in time."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        for file in runs.glob(f"*/{FILE_NAME}"):
            with contextlib.suppress(JournalError), open_record(file.parent) as record:  # it may only just be begun
                if record.status is Status.ENDED:
                    return outcome_of(record)
        time.sleep(0.1)
    return None


def test_ctrl_c_while_a_run_gets_ready_leaves_no_run_behind_that_nobody_sees(tmp_path: Path) -> None:
    """The first run after an installation compiles, says so, and has no screen yet."""
    environment = {**os.environ, "TRUNDLE_RUNS": str(tmp_path / "runs"), "NUMBA_CACHE_DIR": str(tmp_path / "kernels")}
    process = subprocess.Popen(
        [str(TRUNDLE), "run", "short-errand", "--detach"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        env=environment,
    )
    assert process.stderr is not None
    assert process.stderr.readline().startswith("Compiling the simulator")
    process.send_signal(signal.SIGINT)
    assert process.wait(30.0) == Exit.ABORTED
    assert "Stopped by Ctrl-C." in process.stderr.read()
    (folder,) = (file.parent for file in (tmp_path / "runs").glob(f"*/{FILE_NAME}"))
    with open_record(folder) as record:
        assert record.status is Status.BROKEN_OFF
        assert not any(isinstance(entry.value, Go) for entry in record.entries())
