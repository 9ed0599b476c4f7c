"""`trundle hold | release | skip | answer | abort | say`: act on a run from a script or from another terminal.

Each waits until the run has had it, and says what came of it. Exit code 0 means that it had its effect.
"""

from __future__ import annotations

import argparse
import sys
from dataclasses import dataclass

from runner.cli.exits import Exit
from runner.cli.watch import add_run_argument


@dataclass(frozen=True, slots=True)
class DeedCommand:
    """One such command. `text` names what must be given besides the run, if anything."""

    name: str
    help: str
    done: str
    text: str = ""

    def add_parser(self, subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
        parser = subparsers.add_parser(self.name, help=self.help, description=f"{self.help.capitalize()}.")
        if self.text:
            parser.add_argument("text", metavar=self.text)
            parser.add_argument("--run", default="latest", metavar="RUN", help='the run (default: "latest")')
        else:
            add_run_argument(parser)

    def run(self, arguments: argparse.Namespace) -> int:
        from runner.host.messages import Deed
        from runner.host.remote import UnreachableError, do
        from runner.journal.errors import JournalError
        from runner.journal.runs import find_run, runs_folder

        try:
            folder = find_run(runs_folder(), arguments.run)
            done = do(folder, Deed(self.name), arguments.text if self.text else "")
        except (JournalError, UnreachableError) as error:
            print(error, file=sys.stderr)
            return Exit.MISTAKE
        if done.accepted:
            print(f"{folder.name}: {self.done}")
            return Exit.OK
        print(f"{folder.name}: {done.text}", file=sys.stderr)
        return Exit.MISTAKE


DEEDS = (
    DeedCommand("hold", "hold the robot of a run; it stands until it is released", "held"),
    DeedCommand("release", "release a run that is held; it goes on where it was", "released"),
    DeedCommand("skip", "give up the leg under way and go on with the next step", "skipped"),
    DeedCommand("answer", "answer the question that a run has asked", "answered", "WORD"),
    DeedCommand("abort", "halt the robot of a run and end its mission", "aborted"),
    DeedCommand("say", "leave a remark in the record of a run", "noted", "TEXT"),
)
