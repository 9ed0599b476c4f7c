"""`trundle check`: what can be known of a mission before a wheel turns."""

from __future__ import annotations

import argparse
import sys
from typing import TYPE_CHECKING

from runner.cli.exits import Exit
from runner.cli.reading import read, show_findings

if TYPE_CHECKING:
    from runner.machine.checks import Checked
    from runner.machine.table import Machine


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "check",
        help="prove what can be proved of a mission before a wheel turns",
        description=(
            "Reads a mission with its site and robot, compiles it, and checks the machine, the ways over the floor, "
            "and the time and the battery it takes. A warning or a note that you have judged is silenced in the "
            "mission file, by the name shown with it: silence: [tight]."
        ),
    )
    parser.add_argument("mission", metavar="MISSION", help="a mission file, or the name of an example")
    parser.add_argument("--begins", metavar="CLOCK", default="18:00", help="the time of day it begins (18:00)")
    parser.add_argument("--all", action="store_true", help="print the estimates of every step, however many")
    parser.add_argument("--json", action="store_true", help="print findings and estimates as JSON")


def run(arguments: argparse.Namespace) -> int:
    begins = _clock(arguments.begins)
    found = None if begins is None else read(arguments.mission)
    if begins is None or found is None:
        return Exit.MISTAKE
    from runner.machine.checks import check_mission

    mission, machine = found
    checked = check_mission(mission, machine, begins)
    if arguments.json:
        import msgspec

        print(msgspec.json.format(msgspec.json.encode(checked), indent=2).decode())
    else:
        show_findings(checked.findings, mission.sources)
        print(_summary(machine, checked))
        _show_notes(checked)
        _show_estimates(checked, arguments.all)
    return Exit.MISTAKE if any(finding.is_error for finding in checked.findings) else Exit.OK


def _clock(text: str) -> float | None:
    """Seconds since midnight; None after a mistake has been shown."""
    from runner.language.quantities import PhraseError, parse_clock

    try:
        return parse_clock(text)
    except PhraseError as error:
        print(f'"--begins {text}": {error.sentence} Write a time of day, as in 18:00.', file=sys.stderr)
        return None


def _summary(machine: Machine, checked: Checked) -> str:
    from runner.language.diagnostics import Severity

    legs = sum(block.place is not None for block in machine.blocks)
    counts = dict.fromkeys(Severity, 0)
    for finding in checked.findings:
        counts[finding.diagnostic.severity] += 1
    faults = [_counted(counts[severity], severity.value) for severity in Severity if counts[severity]]
    silenced = f" {checked.silenced} silenced." if checked.silenced else ""
    if not counts[Severity.ERROR] and not counts[Severity.WARNING]:
        faults = ["No fault found"] if not counts[Severity.NOTE] else ["No fault found", *faults]
    places = _counted(len(machine.places), "place")
    return f"{machine.name}: {_counted(legs, 'leg')} to {places}. {', '.join(faults)}.{silenced}".replace(
        "No fault found, ", "No fault found. "
    )


def _counted(count: int, word: str) -> str:
    return f"{count} {word}" + ("" if count == 1 else "s")


def _show_notes(checked: Checked) -> None:
    from textwrap import fill

    from runner.language.diagnostics import WHOLE_FILE, Severity

    for finding in checked.findings:
        found = finding.diagnostic
        if found.severity is Severity.NOTE:
            where = "" if found.mark.line == WHOLE_FILE else f"line {found.mark.line}: "
            text = f"note: {where}{found.sentence} [{finding.name}]"
            print(fill(text, 80, initial_indent="  ", subsequent_indent="    "))


def _show_estimates(checked: Checked, every: bool) -> None:
    if checked.estimates is None:
        return
    from runner.machine.estimates_table import as_text

    print()
    print(as_text(checked.estimates, None if every else 60))
