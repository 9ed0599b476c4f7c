"""`trundle verify`: is the record of a run whole, and does the engine agree with it?"""

from __future__ import annotations

import argparse
import sys

from runner.cli.exits import Exit
from runner.cli.watch import add_run_argument


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "verify",
        help="check that the record of a run is whole and follows from what happened",
        description="Checks the chain that holds the entries together, and puts everything that the run was told "
        "through the engine again: it must decide what the record says that it decided.",
    )
    add_run_argument(parser)
    parser.add_argument("--json", action="store_true", help="print the result as JSON")


def run(arguments: argparse.Namespace) -> int:
    from runner.journal.errors import JournalError
    from runner.journal.reader import open_record
    from runner.journal.replay import verify
    from runner.journal.runs import find_run, runs_folder

    try:
        with open_record(find_run(runs_folder(), arguments.run)) as record:
            run_id = record.header.run_id
            verdict = verify(record)
    except JournalError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    if arguments.json:
        import msgspec

        print(msgspec.json.format(msgspec.json.encode(verdict), indent=2).decode())
        return Exit.OK if verdict.sound else Exit.TROUBLE
    broken, parting = verdict.chain_broken_at, verdict.parting
    if broken is not None:
        print(f"{run_id}: the chain breaks at entry {broken}. It or what stands before it was changed.")
    if parting is not None:
        print(
            f"{run_id}: the record and the engine part at entry {parting.entry} ({parting.stamp:.2f} s).\n"
            f"  the record: {parting.recorded}\n  the engine: {parting.replayed}"
        )
    if verdict.sound:
        print(f"{run_id}: the chain is whole, and {verdict.inputs} inputs give the entries again, to the letter.")
        if verdict.from_stamp > 0.0:
            print(f"  Telemetry before {verdict.from_stamp:.0f} s was dropped; from there on it was replayed.")
    return Exit.OK if verdict.sound else Exit.TROUBLE
