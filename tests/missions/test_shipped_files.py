"""The missions, sites, robots and conditions that come with Trundle: readable, drivable, and as large as promised."""

from __future__ import annotations

import math
import os
import subprocess
import sys
from pathlib import Path

import pytest
from numpy import int32
from numpy.typing import NDArray

import missions
from runner.language.reader import load_conditions, load_mission, load_robot, load_site
from runner.machine.compiler import compile_mission
from runner.machine.floor_checks import check_floor
from runner.machine.survey import make_survey
from runner.site.floor import Floor, cell_of, clearance, footprint_free, inscribed_radius, rasterize
from runner.site.routes import regions
from runner.site.values import CELL_M, RobotDescription, Site

TRUNDLE = Path(sys.executable).parent / "trundle"
FOLDER = Path(missions.__file__).parent
MISSIONS = sorted(FOLDER.glob("*.yaml"))
SITES = sorted((FOLDER / "sites").glob("*.yaml"))
ROBOTS = sorted((FOLDER / "robots").glob("*.yaml"))
CONDITIONS = sorted((FOLDER / "conditions").glob("*.yaml"))
CLINIC = FOLDER / "sites" / "harbour-clinic.yaml"


def stem(path: Path) -> str:
    return path.stem


def room_numbers(floor: Floor, shut: list[str], robot: RobotDescription) -> NDArray[int32]:
    return regions(clearance(floor.blocked(shut)) >= inscribed_radius(robot.footprint) + CELL_M)


def test_the_files_the_readme_and_the_commands_speak_of_are_there() -> None:
    assert [path.stem for path in MISSIONS] == ["evening-round", "overnight-endurance", "short-errand"]
    assert {path.stem for path in CONDITIONS} == {
        "quiet",
        "busy",
        "blocked-corridor",
        "door-shut-for-good",
        "twenty-people",
        "night-with-faults",
    }
    assert (len(SITES), len(ROBOTS)) == (2, 3)


@pytest.mark.parametrize("path", MISSIONS, ids=stem)
def test_every_mission_reads_without_a_diagnostic_and_its_places_are_free_and_connected(path: Path) -> None:
    mission = load_mission(path)
    assert check_floor(make_survey(mission, compile_mission(mission))) == []


@pytest.mark.parametrize("path", CONDITIONS, ids=stem)
def test_all_conditions_read_without_a_diagnostic_for_the_clinic(path: Path) -> None:
    assert load_conditions(path, load_site(CLINIC)).begins_at == 18 * 3600.0


@pytest.mark.parametrize("robot_path", ROBOTS, ids=stem)
@pytest.mark.parametrize("site_path", SITES, ids=stem)
def test_every_place_of_every_site_is_free_and_reachable_for_every_robot(site_path: Path, robot_path: Path) -> None:
    site, robot = load_site(site_path), load_robot(robot_path)
    floor = rasterize(site)
    numbers = room_numbers(floor, [], robot)
    for place in site.places:
        assert footprint_free(floor.blocked(), robot.footprint, place.pose), place.name
    reached = {int(numbers[cell_of((place.pose.x, place.pose.y))]) for place in site.places}
    assert len(reached) == 1
    assert 0 not in reached


@pytest.mark.parametrize("path", SITES, ids=stem)
def test_every_door_has_the_width_of_a_door_and_parts_something(path: Path) -> None:
    site, robot = load_site(path), load_robot(FOLDER / "robots" / "tray-runner.yaml")
    floor = rasterize(site)
    opened = room_numbers(floor, [], robot).max()
    for door in site.doors:
        assert 1.0 <= round(math.dist(door.start, door.end), 6) <= 1.4, door.name
        assert room_numbers(floor, [door.name], robot).max() == opened + 1, door.name


def test_the_clinic_is_a_floor_of_45_by_25_meters_with_at_least_twelve_places() -> None:
    site = load_site(CLINIC)
    assert (site.width, site.height) == (45.0, 25.0)
    assert len(site.places) >= 12


def test_the_blocked_corridor_leaves_no_way_to_imaging_and_every_way_to_the_other_stops() -> None:
    site, robot = load_site(CLINIC), load_robot(FOLDER / "robots" / "small-cart.yaml")
    blocked = rasterize(site).blocked()
    for carton in load_conditions(FOLDER / "conditions" / "blocked-corridor.yaml", site).cartons:
        (x, y), (width, depth) = carton.at, carton.size
        low, left = cell_of((x - width / 2.0, y - depth / 2.0))
        high, right = cell_of((x + width / 2.0, y + depth / 2.0))
        blocked[low:high, left:right] = True
    numbers = regions(clearance(blocked) >= inscribed_radius(robot.footprint) + CELL_M)
    parted = {name for name in names_of(site) if not _connected(site, numbers, name)}
    assert parted == {"imaging", "day ward", "linen room"}


def names_of(site: Site) -> list[str]:
    return [place.name for place in site.places]


def _connected(site: Site, numbers: NDArray[int32], name: str) -> bool:
    place, home = site.place(name), site.place("charging bay")
    assert place is not None
    assert home is not None
    return bool(numbers[cell_of((place.pose.x, place.pose.y))] == numbers[cell_of((home.pose.x, home.pose.y))])


@pytest.mark.parametrize(
    ("conditions", "code", "words"),
    [
        ("quiet", 0, ["arrived at laboratory", "completed"]),
        ("blocked-corridor", 0, ["incident 1", "recovery 1, try 1", "clear 3 m", "replan", "arrived at imaging"]),
        ("door-shut-for-good", 3, ["leg to imaging failed: all 3 tries failed", "arrived at reception"]),
    ],
)
def test_the_evening_round_ends_as_its_conditions_promise(
    tmp_path: Path, conditions: str, code: int, words: list[str]
) -> None:
    command = [str(TRUNDLE), "run", str(FOLDER / "evening-round.yaml"), "--pace", "max", "--plain"]
    command += ["--conditions", str(FOLDER / "conditions" / f"{conditions}.yaml"), "--seed", "3"]
    done = subprocess.run(
        command,
        env=dict(os.environ, TRUNDLE_RUNS=str(tmp_path)),
        capture_output=True,
        text=True,
        check=False,
        timeout=120,
    )
    assert done.returncode == code, done.stdout + done.stderr
    for word in words:
        assert word in done.stdout
    assert done.stdout.count("arrived at") >= 6
