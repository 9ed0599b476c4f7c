"""Planners and followers that others install beside Trundle are found by the robot's file, and drive."""

from __future__ import annotations

import math
import os
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from backends.contract import GoalStatus
from backends.sim import parts
from runner.site.values import Pose
from tests.backends.sim.support import CART, HALL, distance, go, start

INSTALLED = Path(__file__).parent / "installed" / "chalk_line"
MISSIONS = Path(__file__).parents[3] / "missions"


@pytest.fixture
def installed(monkeypatch: pytest.MonkeyPatch) -> Iterator[None]:
    """The other people's package, as if it were installed."""
    monkeypatch.syspath_prepend(str(INSTALLED))
    parts._installed.cache_clear()
    yield
    parts._installed.cache_clear()


@pytest.mark.usefixtures("installed")
def test_somebody_elses_planner_draws_the_route() -> None:
    drive = start(HALL, Pose(2.0, 2.0, 0.0), robot=replace(CART, planner="chalk-line"))
    goal = Pose(8.0, 6.0, math.pi / 2.0)
    go(drive, 1, goal)
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert distance(drive.simulator.body.pose, goal) < 0.2
    route = next(one.route for one in drive.telemetry() if one.route)
    assert min(math.dist(point, (8.0, 2.0)) for point in route) < 0.2, "its bend"
    assert {seen.route_number for seen in drive.telemetry()} <= {0, 1}


@pytest.mark.usefixtures("installed")
def test_somebody_elses_follower_drives_at_its_own_speed() -> None:
    drive = start(HALL, Pose(2.0, 2.0, 0.0), robot=replace(CART, follower="plodder"))
    goal = Pose(7.0, 5.0, 0.0)
    go(drive, 1, goal)
    end = drive.until_end(90.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
    assert max(one.speed for one in drive.telemetry()) == pytest.approx(0.3, abs=0.01)
    assert distance(drive.simulator.body.pose, goal) < 0.2


def test_a_part_that_is_not_installed_is_told_with_those_that_are() -> None:
    with pytest.raises(ValueError, match=r'a planner called "chalk-line"\. Installed are: disc-search\.'):
        start(HALL, Pose(2.0, 2.0, 0.0), robot=replace(CART, planner="chalk-line"))
    with pytest.raises(ValueError, match=r'a follower called "plodder"\. Installed are: dynamic-window\.'):
        start(HALL, Pose(2.0, 2.0, 0.0), robot=replace(CART, follower="plodder"))


@pytest.mark.usefixtures("installed")
def test_a_part_that_cannot_be_loaded_is_told_with_its_reason() -> None:
    with pytest.raises(ValueError, match='The planner "broken" cannot be loaded: AttributeError: '):
        start(HALL, Pose(2.0, 2.0, 0.0), robot=replace(CART, planner="broken"))


def test_a_run_names_the_missing_part_and_leaves_no_traceback(tmp_path: Path) -> None:
    robot = tmp_path / "cart.yaml"
    robot.write_text((MISSIONS / "robots" / "small-cart.yaml").read_text() + "planner: crystal-ball\n")
    mission = tmp_path / "errand.yaml"
    text = (MISSIONS / "short-errand.yaml").read_text()
    mission.write_text(text.replace("robots/tray-runner.yaml", str(robot)).replace("sites/", f"{MISSIONS}/sites/"))
    found = subprocess.run(
        [str(Path(sys.executable).with_name("trundle")), "run", str(mission), "--pace", "max", "--plain"],
        capture_output=True, text=True, check=False, env=os.environ | {"TRUNDLE_RUNS": str(tmp_path / "runs")},
    )  # fmt: skip
    told = found.stdout + found.stderr
    assert found.returncode == 2, told
    assert 'The robot asks for a planner called "crystal-ball". Installed are: disc-search.' in told
    assert "Traceback" not in told


ERRAND = """
from dataclasses import replace

from backends.contract import GoalStatus
from runner.site.values import Pose, Solid
from tests.backends.sim.support import CART, HALL, distance, go, start

pillar = Solid(((5.0, 3.5), (6.0, 3.5), (6.0, 4.5), (5.0, 4.5)))
robot = replace(CART, planner="chalk-line", follower="plodder")
drive = start(replace(HALL, solids=(pillar,)), Pose(2.0, 4.0, 0.0), robot=robot)
corner, goal = Pose(3.0, 6.5, 0.0), Pose(9.0, 4.0, 0.0)
for number, pose in enumerate((corner, goal), 1):
    go(drive, number, pose)
    end = drive.until_end(drive.simulator.clock.now() + 120.0)
    print(end.status.value, distance(drive.simulator.body.pose, pose) < 0.2)
print(max(one.speed for one in drive.telemetry()) < 0.31)
"""


def test_in_a_process_of_its_own_both_parts_of_a_package_on_the_path_drive_round_a_pillar() -> None:
    path = os.pathsep.join([str(INSTALLED), str(MISSIONS.parent)])
    found = subprocess.run(
        [sys.executable, "-c", ERRAND], capture_output=True, text=True, check=False,
        env=os.environ | {"PYTHONPATH": path},
    )  # fmt: skip
    assert found.stderr == ""
    assert found.stdout.split() == ["arrived", "True", "arrived", "True", "True"]
