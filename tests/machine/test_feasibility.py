"""The whole footprint along every leg: where it pinches, where it is tight, and which doors are shut when."""

from __future__ import annotations

from dataclasses import replace
from math import pi

from runner.language.mission import Mission, Step
from runner.machine.checks import check_mission
from runner.machine.compiler import compile_mission
from runner.machine.findings import Finding
from runner.site.values import Door, Place, Pose, Site, Wall
from tests.builders import FAR, HOME, ROBOT, SIDE, go, hall, mission, repeat, visit, wait

LONG = replace(ROBOT, name="long cart", footprint=((0.9, 0.25), (-0.2, 0.25), (-0.2, -0.25), (0.9, -0.25)))
"""Passes straight through what it cannot turn in."""


def site_with(*places: Place, walls: tuple[Wall, ...] = (), doors: tuple[Door, ...] = ()) -> Site:
    return replace(hall(), places=(HOME, *places), walls=(*hall().walls, *walls), doors=doors)


def gap(width: float, x: float = 7.0) -> tuple[Wall, Wall]:
    """A wall across the hall with a gap in its middle."""
    return (
        Wall(((x, 1.5 + width / 2), (x, 3.0)), 0.1),
        Wall(((x, 0.0), (x, 1.5 - width / 2)), 0.1),
    )


def found(written: Mission, begins: float = 18 * 3600.0) -> dict[str, Finding]:
    checked = check_mission(written, compile_mission(written), begins)
    return {finding.name: finding for finding in checked.findings if finding.diagnostic.severity.value != "note"}


def check(*steps: Step, site: Site, robot: object = ROBOT) -> dict[str, Finding]:
    return found(replace(mission(*steps, site=site), robot=robot))  # type: ignore[arg-type]


def test_an_open_hall_has_no_findings() -> None:
    assert check(go(FAR), visit([SIDE, HOME]), site=hall()) == {}


def test_a_gap_as_wide_as_the_robot_that_it_can_be_driven_straight_through_is_no_pinch() -> None:
    assert "pinch" not in check(go(FAR), site=site_with(FAR, walls=gap(0.65)))


def test_a_corner_too_tight_to_turn_in_is_a_pinch_with_its_place_and_width() -> None:
    """A passage 0.65 m wide with a corner: a disc of the cart's width goes round it, a cart 1.1 m long does not."""
    block = Wall(((0.0, 1.875), (8.3, 1.875)), 1.25)
    upper = Wall(((9.0, 1.0), (9.0, 3.0)), 0.1)
    closed = Wall(((9.0, 1.0), (10.0, 1.0)), 0.1)
    lower = Wall(((0.0, 0.3), (10.0, 0.3)), 0.6)
    start, end = Place("home", Pose(1.5, 0.925, 0.0)), Place("up", Pose(8.625, 1.8, pi / 2))
    site = replace(site_with(end, walls=(block, upper, closed, lower)), places=(start, end))
    written = replace(mission(go(end, line=7), site=site), start=start)
    assert "pinch" not in found(replace(written, robot=replace(ROBOT, footprint=round_footprint(0.25))))
    finding = found(replace(written, robot=LONG))["pinch"]
    assert finding.is_error
    assert finding.diagnostic.mark.line == 7
    assert 'from "home" to "up"' in finding.diagnostic.sentence
    assert "the free width is about 0." in finding.diagnostic.sentence
    assert "at x 8" in finding.diagnostic.sentence or "at x 7" in finding.diagnostic.sentence


def round_footprint(radius: float) -> tuple[tuple[float, float], ...]:
    from math import cos, sin

    return tuple((radius * cos(pi * part / 8), radius * sin(pi * part / 8)) for part in range(16))


def test_a_pinch_by_a_door_names_the_door() -> None:
    """The way turns right behind the door, along a second wall."""
    behind = Wall(((7.75, 0.8), (7.75, 3.0)), 0.1)
    door = Door("pantry door", (7.0, 1.2), (7.0, 1.8), 0.1)
    beyond = Place("beyond", Pose(8.9, 1.5, 0.0))
    site = site_with(beyond, walls=(*gap(0.6), behind), doors=(door,))
    finding = check(go(beyond), site=site, robot=LONG)
    assert 'by the door "pantry door"' in finding["pinch"].diagnostic.sentence


def test_a_place_in_a_niche_where_the_robot_cannot_turn_is_a_warning() -> None:
    sides = (Wall(((8.5, 1.1), (10.0, 1.1)), 0.1), Wall(((8.5, 1.9), (10.0, 1.9)), 0.1))
    niche = Place("niche", Pose(9.4, 1.5, pi))
    finding = check(go(niche), site=site_with(niche, walls=sides))
    assert finding["cannot-turn-at-place"].is_error is False or "pinch" in finding


def test_a_warning_is_silenced_by_its_name_and_counted_and_an_error_is_not() -> None:
    sides = (Wall(((8.5, 1.1), (10.0, 1.1)), 0.1), Wall(((8.5, 1.9), (10.0, 1.9)), 0.1))
    niche = Place("niche", Pose(9.3, 1.5, 0.0))
    written = mission(go(niche), go(HOME), site=site_with(niche, walls=sides))
    names = set(found(written))
    assert "cannot-turn-at-place" in names
    quiet = replace(written, silenced=tuple(names))
    checked = check_mission(quiet, compile_mission(quiet))
    assert {finding.name for finding in checked.findings if finding.name in names} == {
        name for name, finding in found(written).items() if finding.is_error
    }
    assert checked.silenced >= 1


# --- doors --------------------------------------------------------------------------------------------------------

WALL = Wall(((7.0, 0.0), (7.0, 3.0)), 0.1)
EVENING = (17 * 3600.0, 6 * 3600.0)


def with_door(shut: tuple[float, float], *more: Door) -> Site:
    return site_with(FAR, SIDE, walls=(WALL,), doors=(Door("gate", (7.0, 1.0), (7.0, 2.0), 0.1, (shut,)), *more))


def test_a_door_that_is_shut_whenever_the_leg_may_begin_is_an_error() -> None:
    finding = check(go(FAR, line=4), site=with_door(EVENING))["door-shut"]
    assert (finding.is_error, finding.diagnostic.mark.line) == (True, 4)
    assert "17:00 to 06:00" in finding.diagnostic.help


def test_the_same_mission_in_the_morning_passes() -> None:
    assert found(mission(go(FAR), site=with_door(EVENING)), begins=8 * 3600.0) == {}


def test_a_door_that_may_be_shut_by_the_time_the_leg_begins_is_a_warning() -> None:
    finding = check(wait(600.0), go(SIDE), go(FAR), site=with_door((18 * 3600.0 + 900.0, 20 * 3600.0)))
    assert set(finding) == {"door-may-be-shut"}
    assert "from 18:15 on" in finding["door-may-be-shut"].diagnostic.sentence


def test_a_shut_door_with_another_way_round_is_no_finding() -> None:
    walls = (Wall(((7.0, 0.9), (7.0, 3.0)), 0.1),)
    door = Door("gate", (7.0, 1.0), (7.0, 2.0), 0.1, (EVENING,))
    assert "door-shut" not in check(go(FAR), site=site_with(FAR, walls=walls, doors=(door,)))


def test_a_loop_into_the_night_meets_a_door_that_is_shut_at_night() -> None:
    night = (22 * 3600.0, 6 * 3600.0)
    steps = repeat(go(FAR), go(HOME), wait(60.0), until_clock=5 * 3600.0)
    assert set(check(steps, site=with_door(night))) == {"door-may-be-shut"}
