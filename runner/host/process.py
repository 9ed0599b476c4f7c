"""A run as a process of its own, that outlives the terminal and the command that started it.

`start` and `start_again` start it in a session of its own, with its output in the run's folder, and return once it
serves its control socket, or has failed. `python -m runner.host.process` is that process: what it is to do comes on
its standard input, so no secret and no mission stands in the list of processes.

A process that is told to stop (SIGTERM, as the system does when it shuts down) halts the robot and leaves the run as it
is, to be picked up. To abort a run is a person's wish, and has a command of its own.
"""

from __future__ import annotations

import contextlib
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TextIO

import msgspec

from runner.host.board import Board
from runner.host.launch import Errand, LaunchError, RunError, begin, left, pick_up
from runner.host.remote import UnreachableError, look
from runner.journal.errors import JournalError
from runner.journal.header import person_and_host

OUTPUT = "output.txt"
START_S = 120.0
"""How long a process may take to be ready: the first run after an installation compiles."""
STOP_S = 10.0
"""How long a process that is told to stop may take, before it is killed."""
PREPARING = "getting ready: "
"""How lines begin that a process writes for whoever waits for it to be ready."""
CODES = {"ended": 0, "mistake": 2, "trouble": 6, "stopped": 0}


class StoppedError(BaseException):
    """The process was told to stop. Not an ordinary exception: nothing may take it for trouble and carry on."""


@dataclass(frozen=True, slots=True)
class _Work:
    """What the process is to do. Without an errand it picks the run up."""

    folder: str
    errand: Errand | None = None


def start(errand: Errand, folder: Path) -> int:
    """Begin a run in a process of its own; its process id. LaunchError, with its words, where it did not get ready."""
    return _start(_Work(str(folder.absolute()), errand), folder)


def start_again(folder: Path) -> int:
    """Pick a run up in a process of its own; its process id. LaunchError as `start`."""
    return _start(_Work(str(folder.absolute())), folder)


def _start(work: _Work, folder: Path) -> int:
    folder.mkdir(mode=0o700, parents=True, exist_ok=True)
    with (folder / OUTPUT).open("ab") as output:
        (folder / OUTPUT).chmod(0o600)
        begun = output.tell()
        process = subprocess.Popen(
            [sys.executable, "-m", "runner.host.process"],
            stdin=subprocess.PIPE,
            stdout=output,
            stderr=output,
            start_new_session=True,
        )
    assert process.stdin is not None
    with contextlib.suppress(BrokenPipeError):
        process.stdin.write(msgspec.msgpack.encode(work))
        process.stdin.close()
    said = _Said(folder / OUTPUT, begun)
    try:
        if _is_ready(process, folder, said):
            return process.pid
    except KeyboardInterrupt:
        _stop(process)  # nobody has seen it yet, so nobody would know that it goes on
        raise
    raise LaunchError(said.rest() or f"The run did not get ready in {START_S:g} s. See {folder / OUTPUT}.")


def _is_ready(process: subprocess.Popen[bytes], folder: Path, said: _Said) -> bool:
    """Wait until the process serves its socket, and pass on what it says meanwhile. False where it does not."""
    end = time.monotonic() + START_S
    while time.monotonic() < end and process.poll() is None:
        with contextlib.suppress(UnreachableError):
            look(folder)
            return True
        said.pass_on(sys.stderr)
        time.sleep(0.05)
    said.pass_on(sys.stderr)  # what it said just before it ended
    return process.poll() == 0  # over before anybody could look


def _stop(process: subprocess.Popen[bytes]) -> None:
    """Let it halt the robot and end; by force where it does not."""
    process.terminate()
    try:
        process.wait(STOP_S)
    except subprocess.TimeoutExpired:
        process.kill()
        process.wait()


@dataclass(slots=True)
class _Said:
    """What a process has said in its file from some byte on: while it gets ready, what takes it so long."""

    file: Path
    at: int

    def pass_on(self, stream: TextIO) -> None:
        """Say the whole lines that are new to whoever waits. A mistake that ends the process is not among them: that
        is said once it is known to have ended."""
        for line in self.file.read_bytes()[self.at :].splitlines(keepends=True):
            if not (line.startswith(PREPARING.encode()) and line.endswith(b"\n")):
                return
            stream.write(line.decode(errors="replace").removeprefix(PREPARING))
            stream.flush()
            self.at += len(line)

    def rest(self) -> str:
        return self.file.read_bytes()[self.at :].decode(errors="replace").strip()


def _say_preparation(board: Board) -> None:
    """Before there is a view nobody can attach, so what takes time is said where `start` reads it."""
    if board.view() is None:
        for line in board.feed():
            print(f"{PREPARING}{line.text}", flush=True)


def stop_on_request() -> None:
    """Let SIGTERM halt the robot and leave the run to be picked up; the loss of a terminal is no matter."""

    def stop(*_: object) -> None:
        raise StoppedError("told to stop")

    signal.signal(signal.SIGTERM, stop)
    signal.signal(signal.SIGHUP, signal.SIG_IGN)


def owning(work: Callable[[], object]) -> int:
    """Own a run; how it went, as a code of `CODES`. What went wrong is said on standard error, in words."""
    try:
        work()
    except (LaunchError, JournalError) as error:
        print(error, file=sys.stderr)
        return CODES["mistake"]
    except RunError as error:
        print(error, file=sys.stderr)
        return CODES["trouble"]
    except StoppedError:
        print("Told to stop. The robot was told to halt; the run can be picked up.", file=sys.stderr)
        return CODES["stopped"]
    return CODES["ended"]


def main() -> int:
    """The process itself."""
    os.umask(0o077)
    work = msgspec.msgpack.decode(sys.stdin.buffer.read(), type=_Work)
    stop_on_request()
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    folder, board = Path(work.folder), Board(person_and_host()[0])
    errand = work.errand
    if errand is None:
        return owning(lambda: pick_up(left(folder), folder, board, lambda: _say_preparation(board)))
    return owning(lambda: begin(errand, folder, board, lambda: _say_preparation(board)))


if __name__ == "__main__":
    sys.exit(main())
