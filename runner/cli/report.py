"""`trundle report`: what happened in a run."""

from __future__ import annotations

import argparse
import sys


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "report",
        help="what happened in a run: legs, incidents, interventions, totals",
        description="Shows what happened in a run, from its record: one that ended, goes on, or was broken off.",
    )
    parser.add_argument(
        "run",
        nargs="?",
        default="latest",
        metavar="RUN",
        help='a run\'s id or the beginning of it, a path to a record, or "latest" (the default)',
    )
    parser.add_argument("--json", action="store_true", help="print the same as JSON")


def run(arguments: argparse.Namespace) -> int:
    from runner.journal.errors import JournalError
    from runner.journal.reader import open_record
    from runner.journal.runs import find_run, runs_folder
    from runner.report.summary import summary_of
    from runner.report.text import report_text

    try:
        with open_record(find_run(runs_folder(), arguments.run)) as record:
            summary = summary_of(record)
    except JournalError as error:
        print(error, file=sys.stderr)
        return 2
    if arguments.json:
        import msgspec

        print(msgspec.json.format(msgspec.json.encode(summary), indent=2).decode())
    else:
        print(report_text(summary), end="")
    return 0
