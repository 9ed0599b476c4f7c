"""`trundle watch`: look at a run that goes on, and act on it; leaving the screen leaves the run alone."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from runner.cli.exits import Exit

if TYPE_CHECKING:
    from runner.journal.reader import Record
    from runner.site.values import Point

ROWS_MOST = 3000
"""Rows of the track in which the way of the last 100 m is looked for: ten minutes of driving, and read in no time."""


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "watch",
        help="look at a run that goes on, and act on it",
        description="Attaches a screen to a run. Any number may be attached; leaving one leaves the run alone.",
    )
    add_run_argument(parser)
    parser.add_argument("--plain", action="store_true", help="plain lines instead of a screen; Ctrl-C only leaves")
    parser.add_argument("--read-only", action="store_true", help="only look: no key of this screen acts on the run")


def add_run_argument(parser: argparse.ArgumentParser) -> None:
    """The run that a command is about."""
    parser.add_argument(
        "run",
        nargs="?",
        default="latest",
        metavar="RUN",
        help='a run\'s id or the beginning of it, a path to its folder, or "latest" (the default)',
    )


def run(arguments: argparse.Namespace) -> int:
    from runner.journal.errors import JournalError
    from runner.journal.runs import find_run, runs_folder

    try:
        return attach(find_run(runs_folder(), arguments.run), arguments.plain, arguments.read_only)
    except JournalError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE


def attach(folder: Path, plain: bool = False, read_only: bool = False) -> int:
    """Watch a run until it has ended or the person leaves; the exit code says how it stands. JournalError where there
    is no such run."""
    from runner.host.plan import plan_of
    from runner.host.remote import RemoteSource
    from runner.journal.reader import Status, open_record
    from runner.journal.replay import machine_of
    from runner.screen.showing import Showing
    from runner.screen.terminal import suitable

    with open_record(folder) as record:
        if record.status is not Status.RUNNING:
            from runner.cli.owning import say_outcome

            return say_outcome(folder)
        plan, machine = plan_of(record), machine_of(record)
        before = _troubles(record), tuple(record.newest_positions(ROWS_MOST))
    setup, name = plan.setup, folder.name
    hints = f"trundle report {name}", f"trundle pick-up {name}"
    showing = Showing(plan.mission, name, setup.site, setup.robot, machine.steps, *hints, *before)
    with RemoteSource(folder) as source:
        if plain or not suitable(sys.stdout, sys.stderr, sys.stdin):
            _in_plain_lines(source)
        else:
            from runner.screen.watch import watch

            if not watch(showing, source, read_only):
                _in_plain_lines(source)
    return _left(folder)


def _troubles(record: Record) -> tuple[Point, ...]:
    """Where the incidents so far began."""
    from runner.engine.values import IncidentBegan

    notes = (entry.value for entry in record.entries(names=("incident began",)))
    return tuple((note.pose.x, note.pose.y) for note in notes if isinstance(note, IncidentBegan) and note.pose)


def _left(folder: Path) -> int:
    from runner.cli.owning import say_outcome
    from runner.journal.reader import Status, open_record

    with open_record(folder) as record:
        status = record.status
    if status is Status.RUNNING:
        print(f"The run goes on by itself. To see it again: trundle watch {folder.name}")
        return Exit.OK
    return say_outcome(folder)


def _in_plain_lines(source: object) -> None:
    """The feed as lines, until the run has ended."""
    import time

    from runner.host.remote import RemoteSource
    from runner.screen.plain import PlainPrinter

    assert isinstance(source, RemoteSource)
    printer = PlainPrinter(sys.stdout)
    try:
        while not printer.gone:
            view = source.view()
            printer.show(source.feed(), view, source.age())
            if view is not None and view.outcome is not None:
                return
            time.sleep(0.25)
    except KeyboardInterrupt:
        return
