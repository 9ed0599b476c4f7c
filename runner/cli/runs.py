"""`trundle runs`: the runs that there are."""

from __future__ import annotations

import argparse
import sys


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "runs",
        help="list the runs, newest first, with how they came out",
        description="Lists the runs, newest first. They are kept in TRUNDLE_RUNS, or in your data folder.",
    )
    parser.add_argument("--json", action="store_true", help="print the same as JSON")


def run(arguments: argparse.Namespace) -> int:
    from runner.journal.errors import JournalError
    from runner.journal.runs import list_runs, runs_folder
    from runner.report.listing import listed, listing_text

    runs = runs_folder()
    try:
        found = [listed(folder) for folder in list_runs(runs)]
    except JournalError as error:
        print(error, file=sys.stderr)
        return 2
    if arguments.json:
        import msgspec

        print(msgspec.json.format(msgspec.json.encode(found), indent=2).decode())
    elif found:
        print(listing_text(found), end="")
    else:
        print(f"There are no runs in {runs} yet.")
    return 0
