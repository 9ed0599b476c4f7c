"""Every place a mission uses is free for the robot's footprint and can be come to; or the step is shown."""

from __future__ import annotations

from dataclasses import replace
from math import pi

from runner.machine.compiler import compile_mission
from runner.machine.floor_checks import check_floor
from runner.machine.survey import make_survey
from runner.site.values import Door, Place, Pose, Site, Wall
from tests.builders import FAR, HOME, SIDE, go, hall, mission, repeat, visit


def site_with(*places: Place, walls: tuple[Wall, ...] = (), doors: tuple[Door, ...] = ()) -> Site:
    return replace(hall(), places=(HOME, *places), walls=(*hall().walls, *walls), doors=doors)


def names(*steps: object, site: Site) -> list[tuple[str, int]]:
    written = mission(*steps, site=site)  # type: ignore[arg-type]
    findings = check_floor(make_survey(written, compile_mission(written)))
    return [(finding.name, finding.diagnostic.mark.line) for finding in findings]


def test_an_open_hall_has_no_findings() -> None:
    assert names(go(FAR), visit([SIDE]), site=hall()) == []


def test_a_place_where_only_a_turned_robot_would_fit_is_not_free() -> None:
    along, across = Place("along", Pose(5.0, 0.36, 0.0)), Place("across", Pose(5.0, 0.36, pi / 2))
    assert names(go(along, line=3), go(across, line=4), site=site_with(along, across)) == [("place-not-free", 4)]


def test_a_place_behind_a_wall_is_not_reachable_and_is_shown_once_at_its_first_step() -> None:
    wall = Wall(((7.0, 0.0), (7.0, 3.0)), 0.1)
    steps = (go(SIDE, line=2), repeat(go(FAR, line=4), go(FAR, line=5), times=2))
    assert names(*steps, site=site_with(FAR, SIDE, walls=(wall,))) == [("place-not-reachable", 4)]


def test_a_door_in_the_wall_makes_the_place_reachable() -> None:
    wall = Wall(((7.0, 0.0), (7.0, 3.0)), 0.1)
    door = Door("gate", (7.0, 1.0), (7.0, 2.0), 0.1)
    assert names(go(FAR), site=site_with(FAR, walls=(wall,), doors=(door,))) == []


def test_a_gap_narrower_than_the_robot_is_no_way() -> None:
    upper, lower = Wall(((7.0, 1.70), (7.0, 3.0)), 0.1), Wall(((7.0, 0.0), (7.0, 1.25)), 0.1)
    assert names(go(FAR), site=site_with(FAR, walls=(upper, lower))) == [("place-not-reachable", 1)]


def test_places_in_steps_after_a_failure_are_looked_at_too() -> None:
    wall = Wall(((7.0, 0.0), (7.0, 3.0)), 0.1)
    fallback = go(SIDE, otherwise=(go(FAR, line=9),))
    assert names(fallback, site=site_with(FAR, SIDE, walls=(wall,))) == [("place-not-reachable", 9)]
