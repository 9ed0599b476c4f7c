"""`trundle check`: what can be known of a mission before a wheel turns."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from runner.cli.exits import Exit
from runner.cli.reading import check_all, read, show_findings

if TYPE_CHECKING:
    from runner.machine.table import Machine


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "check",
        help="prove what can be proved of a mission before a wheel turns",
        description="Reads a mission with its site and robot, compiles it, and checks the machine and the floor.",
    )
    parser.add_argument("mission", metavar="MISSION", help="a mission file, or the name of an example")
    parser.add_argument("--json", action="store_true", help="print the findings as JSON")


def run(arguments: argparse.Namespace) -> int:
    found = read(arguments.mission)
    if found is None:
        return Exit.MISTAKE
    mission, machine = found
    findings = check_all(mission, machine)
    if arguments.json:
        import msgspec

        print(msgspec.json.format(msgspec.json.encode(findings), indent=2).decode())
    else:
        show_findings(findings, mission.sources)
    errors = sum(finding.is_error for finding in findings)
    if not arguments.json and not errors:
        legs = sum(block.place is not None for block in machine.blocks)
        print(f"{mission.name}: {legs} legs to {len(machine.places)} places. No fault found.")
        _show_what_ends_it(machine)
    return Exit.MISTAKE if errors else Exit.OK


def _show_what_ends_it(machine: Machine) -> None:
    """A leg that may end the mission says so before it does, whether the author wrote it or nothing."""
    from runner.machine.needs import legs_that_end_the_mission

    for note in legs_that_end_the_mission(machine):
        print(
            f"  line {note.mark.line}: if the leg to {note.text.removeprefix('go to ')} fails, the mission ends there."
        )
