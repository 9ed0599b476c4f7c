"""Every check there is, in the order in which they can be trusted: the table, the floor, then what rests on both."""

from __future__ import annotations

from dataclasses import dataclass

from runner.language.mission import Mission
from runner.machine.findings import Finding
from runner.machine.spans import Span
from runner.machine.table import Machine
from runner.machine.table_checks import check_table

BEGINS_CLOCK = 18.0 * 3600.0
"""The time of day at which a mission is taken to begin where nobody says: that of the conditions by default."""


@dataclass(frozen=True, slots=True)
class StepLine:
    """A line of the table of estimates, seconds, meters and watt-hours; inside a loop for one lap."""

    line: int
    depth: int
    text: str
    begins: Span
    seconds: Span
    meters: Span
    watt_hours: Span


@dataclass(frozen=True, slots=True)
class Estimates:
    """What a mission takes, for people and for scripts. Infinite where nothing bounds it."""

    begins_clock: float
    seconds: Span
    meters: Span
    watt_hours: Span
    steps: tuple[StepLine, ...]
    assumptions: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Checked:
    """`findings` without those that the author silenced; `estimates` is None where the table or a way is broken."""

    findings: tuple[Finding, ...]
    silenced: int
    estimates: Estimates | None


def check_mission(mission: Mission, machine: Machine, begins_clock: float = BEGINS_CLOCK) -> Checked:
    """Everything that can be known of a mission before a wheel turns. An error cannot be silenced."""
    from runner.machine.usage_checks import check_usage

    findings = check_table(machine)
    estimates = None
    if not findings:
        findings, estimates = _check_ways(mission, machine, begins_clock)
    findings = [*findings, *check_usage(mission)]
    kept = tuple(finding for finding in findings if finding.is_error or finding.name not in mission.silenced)
    return Checked(kept, len(findings) - len(kept), estimates)


def _check_ways(mission: Mission, machine: Machine, clock: float) -> tuple[list[Finding], Estimates | None]:
    from runner.machine.door_checks import check_doors
    from runner.machine.estimates import estimate
    from runner.machine.feasibility import check_footprint
    from runner.machine.floor_checks import check_floor
    from runner.machine.limit_checks import check_limits
    from runner.machine.survey import make_survey

    survey = make_survey(mission, machine)
    findings = check_floor(survey)
    if findings:
        return findings, None
    made = estimate(machine, mission, survey.ways, clock)
    findings = [*check_footprint(survey), *check_doors(survey, made), *check_limits(mission, machine, made)]
    whole = made.whole
    lines = tuple(
        StepLine(
            note.mark.line, note.depth, note.text, step.begins, step.cost.seconds, step.cost.meters, step.cost.energy
        )
        for step in made.steps
        for note in (machine.steps[step.step],)
    )
    return findings, Estimates(clock, whole.seconds, whole.meters, whole.energy, lines, made.assumptions)
