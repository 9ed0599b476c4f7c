"""`trundle schema`: a JSON Schema of mission files, for editors."""

from __future__ import annotations

import argparse

from runner.cli.exits import Exit


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    subparsers.add_parser(
        "schema",
        help="print a JSON Schema of mission files, for editors that complete and check",
        description="Prints a JSON Schema (draft 2020-12) of mission files. Send it to a file, and name that file in "
        "the settings of your editor for YAML.",
    )


def run(_: argparse.Namespace) -> int:
    import json

    from runner.language.schema import mission_schema

    print(json.dumps(mission_schema(), indent=2))
    return Exit.OK
