"""Doors by the hour: whether a leg needs a door that is known to be shut when it may be driven."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from runner.language.diagnostics import Diagnostic, Severity
from runner.language.mission import Mark
from runner.machine.estimates import Estimate, Route, StepEstimate
from runner.machine.feasibility import distance_to_door
from runner.machine.findings import Finding
from runner.machine.survey import Survey
from runner.machine.wording import say_clock
from runner.site.floor import cell_of, clearance, doors_shut_at, inscribed_radius
from runner.site.routes import regions
from runner.site.values import DAY_S, Door, Pose
from runner.site.ways import Way

THROUGH_M = 0.15
"""A way leads through a door where it comes within so much of the leaf."""


@dataclass(slots=True)
class _Rooms:
    """Which cells are joined while doors are shut, for each set of them asked for so far."""

    survey: Survey
    known: dict[tuple[str, ...], NDArray[np.int32]] = field(default_factory=dict)
    doors: dict[Route, list[Door]] = field(default_factory=dict)

    def doors_on(self, route: Route) -> list[Door]:
        """The doors with hours that a planned way leads through."""
        if route not in self.doors:
            way = self.survey.ways.get(route)
            self.doors[route] = [] if way is None or not way.exists else _doors_on(self.survey, way)
        return self.doors[route]

    def joined(self, shut: tuple[str, ...], one: Pose, other: Pose) -> bool:
        if shut not in self.known:
            free = clearance(self.survey.floor.blocked(shut)) > inscribed_radius(self.survey.mission.robot.footprint)
            self.known[shut] = regions(free)
        rooms = self.known[shut]
        return bool(rooms[cell_of((one.x, one.y))] == rooms[cell_of((other.x, other.y))])


def check_doors(survey: Survey, estimate: Estimate) -> list[Finding]:
    """Findings `door-shut` (there is no way at any hour at which the leg may begin) and `door-may-be-shut`."""
    if not any(door.shut for door in survey.mission.site.doors):
        return []
    rooms = _Rooms(survey)
    return [
        finding
        for number, place, mark in survey.legs()
        if number in estimate.legs
        for finding in _check_leg(survey, rooms, number, place, mark, estimate)
    ]


def _check_leg(
    survey: Survey, rooms: _Rooms, number: int, place: int, mark: Mark, estimate: Estimate
) -> Iterator[Finding]:
    moments = list(_moments(survey, estimate.legs[number], estimate.begins_clock))
    for before in sorted(survey.approaches[number].places, key=lambda index: -1 if index is None else index):
        doors = rooms.doors_on((before, place))
        bad = {moment: _in_the_way(survey, rooms, before, place, moment, doors) for moment in moments} if doors else {}
        shut = [moment for moment, door in bad.items() if door is not None]
        if shut:
            door = bad[shut[0]]
            assert door is not None, "only moments with a door in the way were kept"
            yield _finding(survey, place, door, mark, always=len(shut) == len(moments), clock=shut[0])
            return


def _moments(survey: Survey, leg: StepEstimate, begins: float) -> Iterator[float]:
    """Clock times that stand for all at which the leg may begin: the first, and each at which a door changes."""
    first = begins + leg.begins.least
    last = min(begins + leg.begins.most, first + DAY_S)
    yield first % DAY_S
    for clock in sorted({clock for door in survey.mission.site.doors for span in door.shut for clock in span}):
        if first + (clock - first) % DAY_S < last:
            yield clock % DAY_S


def _doors_on(survey: Survey, way: Way) -> list[Door]:
    points = [(float(x), float(y)) for x, y in way.points]
    return [
        door
        for door in survey.mission.site.doors
        if door.shut and min(distance_to_door(door, point) for point in points) < THROUGH_M + door.thickness
    ]


def _in_the_way(
    survey: Survey, rooms: _Rooms, before: int | None, place: int, clock: float, doors: list[Door]
) -> Door | None:
    """The door that closes the only way at a time of day."""
    shut = doors_shut_at(survey.mission.site, clock)
    closed = [door for door in doors if door.name in shut]
    if not closed or rooms.joined(shut, survey.target(before).pose, survey.target(place).pose):
        return None
    return closed[0]


def _finding(survey: Survey, place: int, door: Door, mark: Mark, *, always: bool, clock: float) -> Finding:
    hours = ", ".join(f"{say_clock(start)} to {say_clock(end)}" for start, end in door.shut)
    name = survey.target(place).name
    if always:
        sentence = f'The door "{door.name}" is shut whenever this leg to "{name}" may begin, and there is no other way.'
        return Finding(
            "door-shut", Diagnostic(mark, sentence, f"It is shut {hours}. Begin the mission at another time.")
        )
    sentence = (
        f'The door "{door.name}" may be shut when this leg to "{name}" begins, from {say_clock(clock)} on, '
        "and there is no other way."
    )
    return Finding("door-may-be-shut", Diagnostic(mark, sentence, f"It is shut {hours}.", Severity.WARNING))
