"""The command `trundle`. One file a command; each imports its room only when it is called.

Nothing heavier than argparse is imported here, so that `trundle --help` is there at once.
"""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Mapping, Sequence
from typing import Protocol

from runner.cli import check, floor, link, machine, new, pick_up, report, run, runs, schema, verify, watch
from runner.cli.deeds import DEEDS
from runner.cli.exits import MEANINGS, Exit


class Command(Protocol):
    """One command: how it is written, and what it does."""

    def add_parser(self, subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None: ...

    def run(self, arguments: argparse.Namespace) -> int:
        """The exit code."""


COMMANDS: Mapping[str, Command] = {
    "check": check,
    "floor": floor,
    "machine": machine,
    "run": run,
    "runs": runs,
    "watch": watch,
    **{deed.name: deed for deed in DEEDS},
    "pick-up": pick_up,
    "report": report,
    "verify": verify,
    "link": link,
    "new": new,
    "schema": schema,
}

_DESCRIPTION = "Scripted rounds for one indoor mobile robot: run them, watch them, and argue from the record."


def _parser() -> argparse.ArgumentParser:
    codes = "\n".join(f"  {code.value}  {meaning}" for code, meaning in MEANINGS.items())
    parser = argparse.ArgumentParser(
        prog="trundle",
        description=_DESCRIPTION,
        epilog=f"exit codes:\n{codes}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("--version", action="store_true", help="print the version and stop")
    subparsers = parser.add_subparsers(dest="command", metavar="COMMAND")
    for command in COMMANDS.values():
        command.add_parser(subparsers)
    return parser


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command; the exit code says how it went. A user's mistake never ends in a traceback."""
    parser = _parser()
    arguments = parser.parse_args(argv)
    if arguments.version:
        from importlib.metadata import version

        print(f"trundle {version('trundle')}")
        return Exit.OK
    if arguments.command is None:
        parser.print_help()
        return Exit.MISTAKE
    try:
        return int(COMMANDS[arguments.command].run(arguments))
    except BrokenPipeError:
        _leave_quietly()
        return Exit.OK
    except KeyboardInterrupt:
        print("Stopped by Ctrl-C.", file=sys.stderr)
        return Exit.ABORTED


def _leave_quietly() -> None:
    """The reader of our output went away (`| head`): let the interpreter's last flush go nowhere."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
