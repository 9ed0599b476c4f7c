"""`trundle runs`: the runs that there are, where those that go on stand, and the removal of old ones."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from runner.cli.exits import Exit

if TYPE_CHECKING:
    from runner.host.standing import Standing


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "runs",
        help="list the runs, newest first, with how they came out",
        description="Lists the runs, newest first. They are kept in TRUNDLE_RUNS, or in your data folder.",
    )
    parser.add_argument("--json", action="store_true", help="print the same as JSON")
    parser.add_argument("--remove", nargs="+", metavar="RUN", help="remove these runs for good, records and all")
    parser.add_argument(
        "--unfinished-too", action="store_true", help="with --remove: also runs that could still be picked up"
    )


def run(arguments: argparse.Namespace) -> int:
    from runner.journal.errors import JournalError

    try:
        return _remove(arguments.remove, arguments.unfinished_too) if arguments.remove else _list(arguments.json)
    except JournalError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE


def _list(as_json: bool) -> int:
    from runner.journal.runs import list_runs, runs_folder
    from runner.report.listing import listed, listing_text

    runs = runs_folder()
    folders = list_runs(runs)
    found = [listed(folder) for folder in folders]
    standing = {folder.name: stands for folder in folders if (stands := _standing(folder)) is not None}
    if as_json:
        import msgspec

        rows = [{**msgspec.to_builtins(row), "now": msgspec.to_builtins(standing.get(row.run_id))} for row in found]
        print(msgspec.json.format(msgspec.json.encode(rows), indent=2).decode())
    elif found:
        print(listing_text(found), end="")
        for run_id, stands in standing.items():
            print(f"\n{run_id}\n  {stands.text}")
    else:
        print(f"There are no runs in {runs} yet.")
    return Exit.OK


def _standing(folder: Path) -> Standing | None:
    """Where a run stands, if a process owns it."""
    from runner.journal.reader import is_owned

    if not is_owned(folder):
        return None
    from runner.host.standing import standing_of

    return standing_of(folder)


def _remove(asked: list[str], unfinished_too: bool) -> int:
    import shutil

    from runner.journal.errors import JournalError
    from runner.journal.reader import Status, is_owned, open_record
    from runner.journal.runs import find_run, runs_folder

    runs = runs_folder()
    folders = list(dict.fromkeys(find_run(runs, text) for text in asked))
    for folder in folders:  # all are looked at before the first is removed
        if is_owned(folder):
            raise JournalError(f"{folder.name} goes on. Abort it first: trundle abort {folder.name}")
        with open_record(folder) as record:
            unfinished = record.status is not Status.ENDED
        if unfinished and not unfinished_too:
            raise JournalError(f"{folder.name} could be picked up. To remove it all the same: --unfinished-too")
    for folder in folders:
        try:
            shutil.rmtree(folder)
        except OSError as error:
            raise JournalError(f"{folder} cannot be removed: {error.strerror}.") from error
        print(f"{folder.name}: removed")
    return Exit.OK
