"""What several commands begin with: find the mission a person means, read it, and show what is wrong with it."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from runner.language.mission import Mission, Source
    from runner.machine.findings import Finding
    from runner.machine.table import Machine


def read(argument: str) -> tuple[Mission, Machine] | None:
    """The mission and its machine; None after every problem has been printed to standard error."""
    from runner.language.diagnostics import LanguageError
    from runner.language.examples import resolve_mission
    from runner.language.reader import load_mission
    from runner.machine.compiler import compile_mission

    try:
        mission = load_mission(resolve_mission(argument))
    except LanguageError as error:
        show_problems(error)
        return None
    return mission, compile_mission(mission)


def show_problems(error: Exception) -> None:
    """A LanguageError to standard error, as people read it, with the number of its problems."""
    print(error, file=sys.stderr)


def show_findings(findings: Sequence[Finding], sources: Sequence[Source]) -> None:
    """Findings to standard error, errors first."""
    from runner.language.diagnostics import render

    ordered = sorted(findings, key=lambda finding: not finding.is_error)
    if ordered:
        print(render([finding.diagnostic for finding in ordered], sources), file=sys.stderr)


def check_all(mission: Mission, machine: Machine) -> list[Finding]:
    """Every check there is, on the table and on the floor."""
    from runner.machine.floor_checks import check_floor
    from runner.machine.table_checks import check_table

    return [*check_table(machine), *check_floor(mission)]
