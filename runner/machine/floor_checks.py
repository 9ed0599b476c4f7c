"""What is proved on the floor before a wheel turns: every place a mission uses is free and can be come to.

In this version a place is free when the robot's whole footprint fits there, facing as written, and reachable when a
disc of the footprint's inscribed radius gets there with every door open. The disc is optimistic.
"""

from __future__ import annotations

from collections.abc import Iterator

from runner.language.diagnostics import Diagnostic
from runner.language.mission import Go, Mark, Mission, Otherwise, Repeat, Step, Visit
from runner.machine.findings import Finding
from runner.site.values import Place


def check_floor(mission: Mission) -> list[Finding]:
    """Findings on the places of a mission, each once, at the step that uses it first."""
    from runner.site.floor import cell_of, clearance, footprint_free, inscribed_radius, rasterize
    from runner.site.routes import regions

    blocked = rasterize(mission.site).blocked()
    room = regions(clearance(blocked) > inscribed_radius(mission.robot.footprint))
    home = int(room[cell_of((mission.start.pose.x, mission.start.pose.y))])
    findings: list[Finding] = []
    for place, mark in _used(mission).items():
        if not footprint_free(blocked, mission.robot.footprint, place.pose):
            findings.append(_not_free(mission, place, mark))
        elif int(room[cell_of((place.pose.x, place.pose.y))]) != home:
            findings.append(_not_connected(mission, place, mark))
    return findings


def _used(mission: Mission) -> dict[Place, Mark]:
    used = {mission.start: mission.start_mark}
    for place, mark in _visited(mission.steps):
        used.setdefault(place, mark)
    return used


def _visited(steps: tuple[Step, ...]) -> Iterator[tuple[Place, Mark]]:
    for step in steps:
        match step:
            case Go():
                yield step.place, step.mark
            case Visit():
                yield from ((place, mark) for mark, place in step.places)
            case Repeat():
                yield from _visited(step.steps)
            case _:
                pass
        if isinstance(step, Go | Visit) and step.otherwise is not None and not isinstance(step.otherwise, Otherwise):
            yield from _visited(step.otherwise)


def _not_free(mission: Mission, place: Place, mark: Mark) -> Finding:
    sentence = f'The robot "{mission.robot.name}" does not fit at "{place.name}": its footprint overlaps a wall there.'
    return Finding("place-not-free", Diagnostic(mark, sentence, "Move or turn the place in the site file."))


def _not_connected(mission: Mission, place: Place, mark: Mark) -> Finding:
    sentence = f'No way wide enough for the robot leads from "{mission.start.name}" to "{place.name}".'
    advice = "Look in the site file for a wall that closes the way, or for a door that is missing."
    return Finding("place-not-reachable", Diagnostic(mark, sentence, advice))
