"""How far the robot sees along its route, and how fast it drives by that."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from backends.contract import GoalStatus
from backends.sim.caution import CREEP_M_S, SLOW_M_S, Caution
from backends.sim.kernels.path import lengths
from backends.sim.memory import Memory
from backends.sim.outline import outline_of
from backends.sim.planner import Route
from backends.sim.sensing import Scan
from runner.site.values import Pose, RobotDescription, UnseenSpace
from tests.backends.sim.support import CART, HALL, go, start

OUTLINE = outline_of(CART.footprint)
HERE = Pose(1.0, 3.0, 0.0)
QUICK = replace(CART, speed=2.0)


def straight() -> Route:
    """Along x from where the robot stands."""
    points = np.array([(1.0 + 0.1 * step, 3.0) for step in range(60)])
    return Route(points, lengths(points), np.zeros(60))


def caution(ranges: float, robot: RobotDescription = QUICK, mapped: tuple[int, int] = (0, 0)) -> tuple[Caution, Memory]:
    """Of a robot whose beams all run so far, on a floor of 8 x 6 m; `mapped` are columns of cells solid on the map."""
    solid = np.zeros((120, 160), dtype=np.bool_)
    solid[:, slice(*mapped)] = True
    memory = Memory(solid, OUTLINE, robot.lidar)
    seen = np.full(181, ranges)
    memory.take(Scan(seen, -math.pi / 2, math.pi / 180, 0.0, sight=seen), HERE)
    return Caution(robot, OUTLINE, memory), memory


@pytest.mark.parametrize("ranges", [0.8, 1.2, 2.0, 3.0])
def test_the_speed_is_the_one_that_can_be_stopped_in_what_is_seen(ranges: float) -> None:
    """v^2 / 2a' + t v + nose = seen, a' of 0.7 * 0.5 m/s2, t of 0.2 s, the nose 0.1 m before the disc; no cap at all
    where the beams reach farther than that needs."""
    watch, _ = caution(ranges)
    speed = watch.fastest(straight(), 0.0, HERE)
    assert watch.seen <= ranges + 0.1
    assert speed * speed / 0.7 + 0.2 * speed + 0.1 == pytest.approx(watch.seen, abs=1e-6)


def test_what_is_in_plain_view_slows_nothing() -> None:
    watch, _ = caution(math.inf)
    assert watch.fastest(straight(), 0.0, HERE) >= QUICK.speed
    assert caution(math.inf)[0].fastest(straight(), 5.5, Pose(6.5, 3.0, 0.0)) >= QUICK.speed, (
        "near the end of the route"
    )


def test_it_creeps_however_little_it_sees() -> None:
    assert caution(0.05)[0].fastest(straight(), 0.0, HERE) == CREEP_M_S


def test_a_wall_of_the_map_need_not_be_seen_through() -> None:
    watch, _ = caution(1.0, mapped=(36, 160))
    watch.fastest(straight(), 0.0, HERE)
    assert watch.seen > 1.5


@pytest.mark.parametrize(("unseen", "slowest"), [(UnseenSpace.KEEP_OUT, 0.0), (UnseenSpace.DRIVE_SLOWLY, SLOW_M_S)])
def test_before_unseen_space_it_stops_unless_told_to_drive_slowly(unseen: UnseenSpace, slowest: float) -> None:
    robot = replace(CART, unseen_space=unseen)
    watch, memory = caution(0.4, robot)
    memory.forget(HERE, 1.0)
    memory.scan = replace(memory.scan, sight=np.full(181, np.inf))  # type: ignore[type-var]
    assert memory.unseen > 10
    assert watch.fastest(straight(), 0.0, HERE) < 0.3
    assert watch.fastest(straight(), 0.2, replace(HERE, x=1.2)) == slowest


def test_a_robot_whose_lidar_is_blind_stands_and_goes_on_when_it_sees_again() -> None:
    drive = start(HALL, Pose(2.0, 4.0, 0.0))
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    drive.until(3.0)
    drive.simulator.trouble.lidar_blind = True
    drive.until(8.0)
    body = drive.simulator.body
    assert body.drive.still
    stood = body.pose
    drive.until(20.0)
    assert body.pose == stood
    drive.simulator.trouble.lidar_blind = False
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is GoalStatus.ARRIVED
