"""`trundle machine`: the machine a mission compiles to, for people and for drawing programs."""

from __future__ import annotations

import argparse

from runner.cli.exits import Exit
from runner.cli.reading import read


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "machine",
        help="print the machine a mission compiles to",
        description="Prints the states and transitions of a mission as a table, or as a graph in DOT or Mermaid.",
    )
    parser.add_argument("mission", metavar="MISSION", help="a mission file, or the name of an example")
    parser.add_argument("--as", dest="form", choices=("table", "dot", "mermaid"), default="table", help="the form")


def run(arguments: argparse.Namespace) -> int:
    found = read(arguments.mission)
    if found is None:
        return Exit.MISTAKE
    from runner.machine.drawing import FORMATS

    print(FORMATS[arguments.form](found[1]), end="")
    return Exit.OK
