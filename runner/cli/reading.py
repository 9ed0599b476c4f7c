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
    """Errors and warnings to standard error, errors first, each with the name by which it can be silenced."""
    from dataclasses import replace

    from runner.language.diagnostics import Severity, render

    shown = [finding for finding in findings if finding.diagnostic.severity is not Severity.NOTE]
    ordered = sorted(shown, key=lambda finding: not finding.is_error)
    named = [
        replace(finding.diagnostic, help=f"{finding.diagnostic.help} [{finding.name}]".strip()) for finding in ordered
    ]
    if named:
        print(render(named, sources), file=sys.stderr)


def check_all(mission: Mission, machine: Machine) -> list[Finding]:
    """Every check there is, on the table, the floor and the estimates."""
    from runner.machine.checks import check_mission

    return list(check_mission(mission, machine).findings)
