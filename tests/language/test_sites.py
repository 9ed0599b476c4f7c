"""Site, robot and conditions files become the values they describe; FILES.md shows files that can be read."""

from __future__ import annotations

import math
import re
from pathlib import Path

import pytest

import runner.language
from runner.language.reader import load_robot, read_conditions, read_site
from runner.site.values import (
    AboutShare,
    Bystander,
    Carton,
    Clutter,
    Crowd,
    DoorChange,
    Fault,
    FaultKind,
    Pose,
    Solid,
    Walkers,
)
from tests.language import texts

FILES = (Path(runner.language.__file__).parent / "FILES.md").read_text()
LEGEND = "legend: {a: {place: hall, facing: south}, D: {door: gate}}\n"
HEAD = "conditions: Busy\ncoordinates: in meters\n"
EXAMPLES = re.findall(r"```yaml\n(.*?)```", FILES, flags=re.DOTALL)


def example(beginning: str) -> str:
    return next(text for text in EXAMPLES if text.startswith(beginning))


def test_the_site_of_the_reference_is_read() -> None:
    site = read_site(example("site: Harbour clinic"), "site.yaml")
    assert (site.width, site.height) == (45.0, 25.0)
    assert [wall.thickness for wall in site.walls] == [0.15, 0.2, 0.15]
    assert site.walls[2].points == ((30.0, 14.0), (38.0, 14.0), (38.0, 25.0), (30.0, 25.0), (30.0, 14.0))
    assert site.solids[0] == Solid(((20.0, 12.0), (21.0, 12.0), (21.0, 12.6), (20.0, 12.6)))
    assert [door.shut for door in site.doors] == [(), ((79_200.0, 21_600.0),)]
    assert site.place("ward east") is not None
    assert site.places[0].pose == Pose(2.0, 12.5, 0.0)
    assert site.places[1].pose.heading == pytest.approx(math.pi / 2)


def test_the_drawing_of_the_reference_is_read() -> None:
    site = read_site(example("site: Quay office"), "site.yaml")
    assert (site.width, site.height) == (10.0, 2.5)
    assert [place.name for place in site.places] == ["kitchen", "front desk"]
    assert site.places[0].pose == Pose(1.75, 1.25, math.pi)
    (door,) = site.doors
    assert (door.start, door.end, door.thickness) == ((4.75, 1.0), (4.75, 1.5), 0.5)


def test_the_robot_of_the_reference_is_read(tmp_path: Path) -> None:
    path = tmp_path / "cart.yaml"
    path.write_text(example("robot:"))
    robot = load_robot(path)
    assert robot.turn_speed == pytest.approx(math.radians(80.0))
    assert (robot.lidar.beams, robot.lidar.forward, robot.battery.capacity) == (180, 0.15, 240.0)


def test_the_conditions_of_the_reference_are_read() -> None:
    site = read_site(
        example("site: Harbour clinic") + "  kitchen: {at: [10, 5], facing: south}\n",
        "site.yaml",
    )
    conditions = read_conditions(example("conditions:"), "blocked.yaml", site)
    assert conditions.begins_at == 64_800.0
    assert conditions.cartons == (
        Carton((20.0, 12.5), (0.6, 0.4), from_s=120.0, until_s=600.0),
        Carton((31.0, 12.5), (0.5, 0.5), when_near=3.0, stays_s=90.0, low=True),
    )
    assert conditions.doors == (
        DoorChange("pharmacy door", 0.0, open=False),
        DoorChange("pharmacy door", 900.0, open=True),
    )
    assert conditions.walkers == (Walkers(4, 1.3, 0.26, ("ward east", "kitchen"), together=2),)
    assert (conditions.uneven_floor, conditions.battery) == (0.005, 0.6)


def test_people_clutter_and_furniture_of_the_reference_are_read() -> None:
    site = read_site(example("site: Harbour clinic"), "site.yaml")
    conditions = read_conditions(HEAD + example("people about:"), "busy.yaml", site)
    assert conditions.about == (AboutShare(79_200.0, 21_600.0, 0.1),)
    assert conditions.doors_shut_by_people == 0.3
    assert conditions.bystanders == (
        Bystander((33.6, 14.0), from_s=120.0, until_s=180.0),
        Bystander((20.0, 12.5), when_near=3.0, stays_s=40.0),
    )
    assert conditions.crowds == (Crowd(6, 40.0, at_s=300.0), Crowd(4, 60.0, per_hour=2.0))
    assert conditions.clutter == (Clutter(6.0, 600.0, (0.3, 0.6), 0.3, 0.2, ((25_200.0, 68_400.0),)),)
    assert conditions.missing == site.solids
    moved, extra = conditions.extra
    assert moved.corners == tuple((x + 0.5, y) for x, y in site.solids[1].corners)
    assert extra == Solid(((24.7, 13.3), (25.3, 13.3), (25.3, 13.7), (24.7, 13.7)))


def test_the_faults_of_the_reference_are_read() -> None:
    site = read_site(example("site: Harbour clinic"), "site.yaml")
    conditions = read_conditions(HEAD + example("faults:"), "faults.yaml", site)
    assert conditions.faults == (
        Fault(FaultKind.WHEELS_STUCK, 20.0, at_s=300.0),
        Fault(FaultKind.SLIP, 15.0, per_hour=2.0, slip=0.4),
        Fault(FaultKind.LIDAR_BLIND, 30.0, per_hour=1.0),
        Fault(FaultKind.EMERGENCY_STOP, 60.0, at_s=1200.0),
        Fault(FaultKind.SILENT, 45.0, at_s=1800.0),
        Fault(FaultKind.CARRIED, at_s=2400.0, to=site.places[1].pose),
        Fault(FaultKind.CARRIED, at_s=3000.0, to=Pose(12.0, 12.5, math.pi / 2)),
        Fault(FaultKind.CARRIED, per_hour=3.0 / 24.0),
    )


def test_walls_of_a_drawing_cover_exactly_its_wall_squares() -> None:
    site = texts.site(texts.DRAWN)
    rows = ["########", "#a.D..b#", "########"]
    for row, line in enumerate(rows):
        for column, character in enumerate(line):
            x, y = (column + 0.5) * 0.5, (len(rows) - row - 0.5) * 0.5
            covering = [
                solid
                for solid in site.solids
                if solid.corners[0][0] < x < solid.corners[2][0] and solid.corners[0][1] < y < solid.corners[2][1]
            ]
            assert len(covering) == (1 if character == "#" else 0)


def test_a_door_drawn_between_walls_to_its_left_and_right_lies_flat() -> None:
    text = "site: x\nsquare: 1 m\ndrawing: |\n  .a.\n  #D#\n" + LEGEND
    (door,) = read_site(text, "x.yaml").doors
    assert (door.start, door.end) == ((1.0, 0.5), (2.0, 0.5))


def test_a_door_drawn_over_several_squares_is_one_door() -> None:
    text = "site: x\nsquare: 1 m\ndrawing: |\n  #.a\n  D..\n  D..\n  #\n" + LEGEND
    (door,) = read_site(text, "x.yaml").doors
    assert (door.start, door.end) == ((0.5, 1.0), (0.5, 3.0))


def test_coordinates_may_be_in_centimeters_or_carry_their_unit() -> None:
    text = (
        texts.SITE.replace("in meters", "in centimeters").replace("[5, 5]", "[500, 5 m]").replace("[15, 5]", "[1, 1]")
    )
    pose = read_site(text, "x.yaml").places[0].pose
    assert (pose.x, pose.y) == (5.0, 5.0)


def test_a_footprint_may_be_a_polygon(tmp_path: Path) -> None:
    path = tmp_path / "cart.yaml"
    corners = "[[0.35 m, 0 m], [-20 cm, 0.25 m], [-0.2 m, -0.25 m]]"
    path.write_text(example("robot:").replace("60 cm x 44 cm", corners))
    assert load_robot(path).footprint == ((0.35, 0.0), (-0.2, 0.25), (-0.2, -0.25))
