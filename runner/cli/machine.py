"""`trundle machine`: the machine a mission compiles to, for people and for drawing programs."""

from __future__ import annotations

import argparse
import sys
from typing import TYPE_CHECKING

from runner.cli.exits import Exit
from runner.cli.reading import read

if TYPE_CHECKING:
    from runner.machine.table import Machine


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "machine",
        help="print the machine a mission compiles to",
        description="Prints the states and transitions of a mission as a table, as JSON, or as a DOT or Mermaid graph.",
    )
    parser.add_argument("mission", metavar="MISSION", help="a mission file, or the name of an example")
    parser.add_argument(
        "--as", dest="form", choices=("table", "dot", "mermaid", "json"), default="table", help="the form"
    )
    parser.add_argument("--compare", metavar="RUN", help="show where the machine in the record of a run differs")


def run(arguments: argparse.Namespace) -> int:
    found = read(arguments.mission)
    if found is None:
        return Exit.MISTAKE
    if arguments.compare is not None:
        return _compare(found[1], arguments.compare)
    from runner.machine.drawing import FORMATS

    print(FORMATS[arguments.form](found[1]), end="")
    return Exit.OK


def _compare(machine: Machine, run_name: str) -> int:
    """Say whether a mission still compiles to what a run ran."""
    from runner.journal.errors import JournalError
    from runner.journal.reader import open_record
    from runner.journal.replay import machine_of
    from runner.journal.runs import find_run, runs_folder
    from runner.machine.drawing import differences

    try:
        with open_record(find_run(runs_folder(), run_name)) as record:
            lines = differences(machine_of(record), machine)
    except JournalError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    print("\n".join(lines) if lines else "The run's machine is the same.")
    return Exit.OK
