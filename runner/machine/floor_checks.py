"""What is proved of places before a wheel turns: each one a mission uses is free, and a disc can get there.

A place is free when the robot's whole footprint fits there, facing as written. Reachable, here, is what a disc of the
footprint's inscribed radius reaches with every door open; what the whole footprint needs is in `feasibility`.
"""

from __future__ import annotations

from runner.language.diagnostics import Diagnostic
from runner.language.mission import Mark, Mission
from runner.machine.findings import Finding
from runner.machine.survey import Survey
from runner.machine.table import Target
from runner.site.floor import cell_of, footprint_free, inscribed_radius
from runner.site.routes import regions


def check_floor(survey: Survey) -> list[Finding]:
    """Findings on the places of a mission, each once, at the step that uses it first."""
    mission = survey.mission
    room = regions(survey.clearance > inscribed_radius(mission.robot.footprint))
    home = _region_at(room, survey.target(None))
    findings: list[Finding] = []
    for target, mark in places_used(survey).items():
        if not footprint_free(survey.blocked, mission.robot.footprint, target.pose):
            findings.append(_not_free(mission, target, mark))
        elif _region_at(room, target) != home:
            findings.append(_not_connected(mission, target, mark))
    return findings


def places_used(survey: Survey) -> dict[Target, Mark]:
    """Every place of the mission with the mark of the step that uses it first; the start comes first."""
    used = {survey.target(None): survey.mission.start_mark}
    for _, place, mark in survey.legs():
        used.setdefault(survey.target(place), mark)
    return used


def _region_at(room: object, target: Target) -> int:
    import numpy as np

    grid = np.asarray(room)
    row, column = cell_of((target.pose.x, target.pose.y))
    inside = 0 <= row < grid.shape[0] and 0 <= column < grid.shape[1]
    return int(grid[row, column]) if inside else 0


def _not_free(mission: Mission, place: Target, mark: Mark) -> Finding:
    sentence = f'The robot "{mission.robot.name}" does not fit at "{place.name}": its footprint overlaps a wall there.'
    return Finding("place-not-free", Diagnostic(mark, sentence, "Move or turn the place in the site file."))


def _not_connected(mission: Mission, place: Target, mark: Mark) -> Finding:
    sentence = f'No way wide enough for the robot leads from "{mission.start.name}" to "{place.name}".'
    advice = "Look in the site file for a wall that closes the way, or for a door that is missing."
    return Finding("place-not-reachable", Diagnostic(mark, sentence, advice))
