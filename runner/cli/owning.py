"""How a command owns a run or lets another process own it: in plain lines, as a service, detached, or under a screen.

In plain lines and as a service the run lives in this process. Detached and under a screen it has one of its own, so
that the terminal, the screen and this command may die and the run goes on.
"""

from __future__ import annotations

import argparse
import contextlib
import os
import signal
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from runner.cli.exits import Exit

if TYPE_CHECKING:
    from runner.host.board import Board
    from runner.journal.outcome import RunOutcome
    from runner.screen.outlet import Outlet

ABORTING = {signal.SIGINT: "Ctrl-C", signal.SIGTERM: "SIGTERM"}
"""Signals that abort a run in plain lines in an orderly way, and who is named for them in the record."""

ENOUGH_S = 2.0
"""A reader that takes lines at all has taken them after this."""


@dataclass(frozen=True, slots=True)
class Task:
    """A run to be owned: `own` does it in this process, `start` in one of its own."""

    folder: Path
    own: Callable[[Board, Callable[[], None]], object]
    start: Callable[[], int]


def add_mode_options(parser: argparse.ArgumentParser) -> None:
    modes = parser.add_mutually_exclusive_group()
    modes.add_argument("--plain", action="store_true", help="plain lines instead of a screen; Ctrl-C aborts")
    modes.add_argument("--detach", action="store_true", help="start the run, say its name, and return")
    modes.add_argument(
        "--service",
        action="store_true",
        help="plain lines for a service manager: being told to stop halts the robot and leaves the run to be picked up",
    )


def waits_for_person(arguments: argparse.Namespace) -> bool:
    """Whether a run in trouble waits for a person. One in plain lines belongs to a script, which wants to know."""
    return not in_plain_lines(arguments)


def in_plain_lines(arguments: argparse.Namespace) -> bool:
    """Asked for, or because there is no terminal that could hold a screen."""
    if arguments.detach or arguments.service:
        return False
    from runner.screen.terminal import suitable

    return arguments.plain or not suitable(sys.stdout, sys.stderr, sys.stdin)


def carry(arguments: argparse.Namespace, task: Task) -> int:
    """Own the run in the way asked for; the exit code says how it went."""
    from runner.host.launch import LaunchError, RunError
    from runner.host.process import StoppedError
    from runner.journal.errors import JournalError

    try:
        if arguments.service or in_plain_lines(arguments):
            _here(task, arguments.service)
            return say_outcome(task.folder)
        task.start()
    except (LaunchError, JournalError) as error:
        _forget_if_empty(task.folder)
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    except RunError as error:
        print(error, file=sys.stderr)
        print(f"The robot was told to halt. The record up to then: trundle report {task.folder.name}", file=sys.stderr)
        return Exit.TROUBLE
    except StoppedError:
        print(f"Told to stop. The robot was told to halt. To go on: trundle pick-up {task.folder.name}")
        return Exit.OK
    if arguments.detach:
        print(f"{task.folder.name}\nThe run goes on by itself. To see it: trundle watch {task.folder.name}")
        return Exit.OK
    from runner.cli.watch import attach

    return attach(task.folder)


def _here(task: Task, service: bool) -> None:
    """The run in this process, with its feed as lines."""
    from runner.host.board import Board
    from runner.host.process import stop_on_request
    from runner.journal.header import person_and_host
    from runner.screen.outlet import Outlet
    from runner.screen.plain import PlainPrinter

    board = Board(person_and_host()[0])
    outlet = Outlet(sys.stdout)
    printer = PlainPrinter(outlet)
    if service:
        stop_on_request()
    else:
        for number, who in ABORTING.items():
            signal.signal(number, _aborting(board, who))
        signal.signal(signal.SIGHUP, lambda *_: _write_to(task.folder))
    try:
        task.own(board, lambda: printer.show(board.feed(), board.view()))
    finally:
        printer.show(board.feed(), board.view())
        _let_out(outlet)


def _let_out(outlet: Outlet) -> None:
    """Wait for whoever reads the lines; if that takes long, a signal ends this command, for the run is over."""
    if outlet.close(ENOUGH_S):
        return
    for number in ABORTING:
        signal.signal(number, signal.SIG_DFL)
    outlet.close()


def _aborting(board: Board, who: str) -> Callable[..., None]:
    from runner.machine.table import Event

    return lambda *_: board.wish(Event.ABORT, who)


def _write_to(folder: Path) -> None:
    """The terminal is gone, the run is not: what it still says goes to its folder."""
    with contextlib.suppress(OSError):
        output = os.open(folder / "output.txt", os.O_WRONLY | os.O_CREAT | os.O_APPEND, 0o600)
        for number in (1, 2):
            os.dup2(output, number)
        os.close(output)


def _forget_if_empty(folder: Path) -> None:
    """A run that never began leaves nothing behind."""
    from runner.journal.schema import FILE_NAME

    if folder.is_dir() and not (folder / FILE_NAME).exists():
        with contextlib.suppress(OSError):
            for file in folder.iterdir():
                file.unlink()
            folder.rmdir()


def say_outcome(folder: Path) -> int:
    """How a run came out, in a line and as an exit code."""
    from runner.journal.outcome import RunOutcome, outcome_of
    from runner.journal.reader import open_record

    with open_record(folder) as record:
        outcome = outcome_of(record)
    print(f"{outcome.value}\nThe record: trundle report {folder.name}")
    codes: dict[RunOutcome, Exit] = {
        RunOutcome.ALL_ARRIVED: Exit.OK,
        RunOutcome.SOME_MISSED: Exit.LEGS_MISSED,
        RunOutcome.ENDED_EARLY: Exit.ENDED_EARLY,
        RunOutcome.ABORTED: Exit.ABORTED,
        RunOutcome.RUNNING: Exit.OK,
    }
    return codes.get(outcome, Exit.TROUBLE)
