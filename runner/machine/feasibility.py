"""Whether the robot's whole footprint can be driven along each leg, turning included, and where it pinches if not.

Planning for a disc is optimistic: it sends robots into gaps that only fit them straight on, or not at all. So each
planned way is swept with the footprint, and where that is not enough, everything the footprint can get to is found by
a search over cells and headings (`runner.site.lattice`), which may also drive backward.
"""

from __future__ import annotations

import math
from collections.abc import Iterator

from runner.language.diagnostics import Diagnostic, Severity
from runner.language.mission import Mark
from runner.machine.findings import Finding
from runner.machine.floor_checks import places_used
from runner.machine.survey import Survey
from runner.machine.table import Target
from runner.site.floor import cell_of, circumscribed_radius, footprint_free, inscribed_radius
from runner.site.lattice import Reach, reach, roomy
from runner.site.routes import regions
from runner.site.sweep import HALF_DIAGONAL_M, Hit, poses_along, sweep, turn_hit
from runner.site.values import CELL_M, Door, Point, Pose
from runner.site.ways import Way, plan_ways

NEAR_DOOR_M = 0.75
"""A pinch so near to a door is called by its name."""
AROUND_M = 0.6
"""The width at a pinch is the least along so much of the way to each side."""


def check_footprint(survey: Survey) -> list[Finding]:
    """Findings `pinch`, `tight` and `cannot-turn-at-place`."""
    pinched = _pinches(survey)
    names = {name for name, _ in pinched}
    return [finding for _, finding in pinched] + list(_tight(survey, names))


def _pinches(survey: Survey) -> list[tuple[str, Finding]]:
    """The places that the footprint cannot get to although a disc can, with where it fails."""
    footprint, start = survey.mission.robot.footprint, survey.mission.start.pose
    used = {target: mark for target, mark in places_used(survey).items() if _free(survey, target)}
    if not _free(survey, survey.target(None)) or all_roomy(survey, list(used)):
        return []
    room = regions(survey.clearance > inscribed_radius(footprint))
    home = room[cell_of((start.x, start.y))]
    within = reach(survey.blocked, survey.clearance, footprint, start)
    reached = {target for target in used if within.holds(target.pose)} | {survey.target(None)}
    reached |= _swept_to(survey, reached)
    return [
        (target.name, _pinch(survey, within, target, mark))
        for target, mark in used.items()
        if home and room[cell_of((target.pose.x, target.pose.y))] == home and target not in reached
    ]


def _swept_to(survey: Survey, reached: set[Target]) -> set[Target]:
    """Places that the lattice is too coarse for, but that the planned way from one that is reached simply leads to."""
    found: set[Target] = set()
    for route, _ in survey.routes():
        come_from, target = survey.target(route[0]), survey.target(route[1])
        if target in reached or come_from not in reached | found or not survey.ways[route].exists:
            continue
        poses = poses_along(survey.ways[route].points)
        turns = ((come_from.pose, poses[0].heading), (target.pose, poses[-1].heading)) if poses else ()
        footprint = survey.mission.robot.footprint
        if sweep(survey.blocked, survey.clearance, footprint, poses) is None and not any(
            _cannot_turn(survey, pose, heading) for pose, heading in turns
        ):
            found.add(target)
    return found


def all_roomy(survey: Survey, targets: list[Target]) -> bool:
    """Whether ways with room for a full turn everywhere join all places: then nothing more need be looked at."""
    room = regions(roomy(survey.clearance, survey.mission.robot.footprint))
    numbers = {int(room[cell_of((target.pose.x, target.pose.y))]) for target in targets}
    return not targets or (len(numbers) == 1 and 0 not in numbers)


def _free(survey: Survey, target: Target) -> bool:
    """Whether the footprint fits at a place; where not, that has a finding of its own."""
    return footprint_free(survey.blocked, survey.mission.robot.footprint, target.pose)


# --- no way for the footprint -------------------------------------------------------------------------------------


def _pinch(survey: Survey, within: Reach, target: Target, mark: Mark) -> Finding:
    way, name = _way_that_fails(survey, within, target)
    at = next((point for point in _points(way) if not within.near(point)), None)
    robot = survey.mission.robot.name
    if at is None:
        at = (target.pose.x, target.pose.y)
        sentence = (
            f'The robot "{robot}" cannot come to stand at "{target.name}" facing as written: '
            f"there is no room to turn at {say_point(at)}."
        )
        return Finding("pinch", Diagnostic(mark, sentence, "Turn or move the place, or widen the way to it."))
    sentence = (
        f'The robot "{robot}" cannot get from "{name}" to "{target.name}": its whole footprint does not pass '
        f"{say_where(survey, at)}, {_say_width(survey, way, at)}. A disc as wide as it would."
    )
    return Finding("pinch", Diagnostic(mark, sentence, _say_need(survey)))


def _way_that_fails(survey: Survey, within: Reach, target: Target) -> tuple[Way, str]:
    """A planned way to the place from one the robot gets to; else the way from the start."""
    for (before, place), _ in survey.routes():
        come_from = survey.target(before)
        if survey.target(place) == target and within.holds(come_from.pose) and survey.ways[before, place].exists:
            return survey.ways[before, place], come_from.name
    start = survey.mission.start
    pair = ((start.pose.x, start.pose.y), (target.pose.x, target.pose.y))
    return plan_ways(survey.clearance, survey.mission.robot.footprint, [pair])[pair], start.name


# --- ways that are tight ------------------------------------------------------------------------------------------


def _tight(survey: Survey, pinched: set[str]) -> Iterator[Finding]:
    told: set[str] = set()
    for route, mark in survey.routes():
        come_from, target = survey.target(route[0]), survey.target(route[1])
        way = survey.ways[route]
        if not way.exists or {come_from.name, target.name} & pinched or _has_room(survey, way):
            continue
        poses = poses_along(way.points)
        hit = sweep(survey.blocked, survey.clearance, survey.mission.robot.footprint, poses)
        if hit is not None:
            yield _too_tight(survey, come_from, target, way, hit, mark)
        if poses:
            for place, heading in ((come_from, poses[0].heading), (target, poses[-1].heading)):
                if place.name not in told and _cannot_turn(survey, place.pose, heading):
                    told.add(place.name)
                    yield _no_turn(survey, place, mark)


def _has_room(survey: Survey, way: Way) -> bool:
    """Whether the robot can turn all the way round everywhere on its way."""
    need = circumscribed_radius(survey.mission.robot.footprint) + HALF_DIAGONAL_M + 2.0 * CELL_M
    rows, columns = (way.points[:, ::-1] / CELL_M).astype(int).T
    shape = survey.clearance.shape
    found = survey.clearance[rows.clip(0, shape[0] - 1), columns.clip(0, shape[1] - 1)]
    return bool((found > need).all())


def _cannot_turn(survey: Survey, pose: Pose, heading: float) -> bool:
    footprint = survey.mission.robot.footprint
    return turn_hit(survey.blocked, survey.clearance, footprint, pose, heading) is not None


def _too_tight(survey: Survey, come_from: Target, target: Target, way: Way, hit: Hit, mark: Mark) -> Finding:
    at = (hit.pose.x, hit.pose.y)
    sentence = (
        f'The planned way from "{come_from.name}" to "{target.name}" is too tight for the whole footprint '
        f"{say_where(survey, at)}, {_say_width(survey, way, at)}. There is a way through, but the robot has to find it."
    )
    return Finding("tight", Diagnostic(mark, sentence, _say_need(survey), Severity.WARNING))


def _no_turn(survey: Survey, place: Target, mark: Mark) -> Finding:
    at = say_point((place.pose.x, place.pose.y))
    sentence = (
        f'The robot "{survey.mission.robot.name}" cannot turn on the spot at "{place.name}", {at}, as its way asks.'
    )
    advice = "Move the place away from the wall, or turn it so that the way leads straight in and out."
    return Finding("cannot-turn-at-place", Diagnostic(mark, sentence, advice, Severity.WARNING))


# --- words --------------------------------------------------------------------------------------------------------


def say_point(point: Point) -> str:
    """`x 3.25 m, y 4.10 m`."""
    return f"x {point[0]:.2f} m, y {point[1]:.2f} m"


def say_where(survey: Survey, point: Point) -> str:
    """`at x 3.25 m, y 4.10 m, by the door "pantry door"`."""
    doors = sorted((distance_to_door(door, point), door.name) for door in survey.mission.site.doors)
    if doors and doors[0][0] < NEAR_DOOR_M:
        return f'at {say_point(point)}, by the door "{doors[0][1]}"'
    return f"at {say_point(point)}, between walls or furniture"


def distance_to_door(door: Door, point: Point) -> float:
    """Meters from a point to the middle line of a door's leaf."""
    (x1, y1), (x2, y2) = door.start, door.end
    square = (x2 - x1) ** 2 + (y2 - y1) ** 2
    along = 0.0 if square == 0.0 else ((point[0] - x1) * (x2 - x1) + (point[1] - y1) * (y2 - y1)) / square
    along = min(max(along, 0.0), 1.0)
    return math.dist(point, (x1 + along * (x2 - x1), y1 + along * (y2 - y1)))


def _say_width(survey: Survey, way: Way, at: Point) -> str:
    near = [point for point in _points(way) if math.dist(point, at) <= AROUND_M]
    narrow = min(_clearance_at(survey, point) for point in [*near, at])
    return f"where the free width is about {max(0.0, 2.0 * narrow - CELL_M):.2f} m"


def _clearance_at(survey: Survey, point: Point) -> float:
    row, column = cell_of(point)
    rows, columns = survey.clearance.shape
    return float(survey.clearance[min(max(row, 0), rows - 1), min(max(column, 0), columns - 1)])


def _say_need(survey: Survey) -> str:
    footprint = survey.mission.robot.footprint
    return (
        f"The footprint needs {2.0 * inscribed_radius(footprint):.2f} m at its narrowest and "
        f"{2.0 * circumscribed_radius(footprint):.2f} m to turn on the spot; cells of 5 cm may ask for one more."
    )


def _points(way: Way) -> list[Point]:
    return [(float(x), float(y)) for x, y in way.points]
