"""`trundle pick-up`: go on with a run whose process died."""

from __future__ import annotations

import argparse
import sys
from typing import TYPE_CHECKING

from runner.cli.exits import Exit
from runner.cli.owning import Task, add_mode_options, carry

if TYPE_CHECKING:
    from pathlib import Path

    from runner.host.launch import Left


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "pick-up",
        help="go on with a run whose process died",
        description="Goes on with a run whose process died, at the same step and with the same goal, and says so. "
        "A real robot has kept its place; a simulated world is built anew as late as the run is.",
    )
    parser.add_argument(
        "run",
        nargs="?",
        metavar="RUN",
        help="a run's id or the beginning of it, or a path to its folder (default: the newest that can be picked up)",
    )
    parser.add_argument("--if-any", action="store_true", help="where there is none to pick up, all is well")
    add_mode_options(parser)


def run(arguments: argparse.Namespace) -> int:
    from runner.journal.errors import JournalError

    try:
        found = _found(arguments.run)
    except JournalError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    if found is None:
        from runner.host.service import ServiceManager

        ServiceManager().ready()  # a service of the kind that says when it is ready has failed where it does not
        print("There is no run to pick up.", file=sys.stdout if arguments.if_any else sys.stderr)
        return Exit.OK if arguments.if_any else Exit.MISTAKE
    folder, left = found
    print(left.sentence, flush=True)
    from runner.host.launch import pick_up
    from runner.host.process import start_again

    return carry(
        arguments,
        Task(
            folder,
            lambda board, after_turn: pick_up(left, folder, board, after_turn),
            lambda: start_again(folder),
        ),
    )


def _found(asked: str | None) -> tuple[Path, Left] | None:
    """The run asked for and how it was left; else the newest that was left unfinished. JournalError where the one
    asked for cannot be picked up."""
    from runner.host.launch import left
    from runner.journal.errors import JournalError
    from runner.journal.runs import find_run, list_runs, runs_folder

    if asked is not None:
        folder = find_run(runs_folder(), asked)
        return folder, left(folder)
    for folder in list_runs(runs_folder()):
        try:
            return folder, left(folder)
        except JournalError:
            continue
    return None
