"""Compiling every kernel before time counts, by running a small world in which all of them are needed.

Compiling is the work of one core, so a second process begins with the kernels that the small world needs last, and the
two meet where they meet: what one has compiled and kept, the other finds. Both run what a real run runs, so that the
kernels are compiled for the very types that they will be called with.
"""

from __future__ import annotations

import os
import subprocess
import sys
from datetime import datetime
from pathlib import Path

from backends.contract import Backend, Goal, Setup
from runner.site.values import (
    Battery,
    Bystander,
    Carton,
    Conditions,
    Lidar,
    Place,
    Pose,
    Post,
    RobotDescription,
    Site,
    Sweep,
    Walkers,
    Wall,
)

_SAME = {"PYTHONPATH": str(Path(__file__).parents[2])}
"""So that the second process finds this very code, wherever it is started."""


def warm_up() -> None:
    """Use every kernel once. A quarter of a minute on two cores after an installation; then they are kept
    (`runner.site.compiled`)."""
    from backends.sim.kernels.window import choose
    from runner.site.compiled import is_kept

    second = None if is_kept(choose) or (os.cpu_count() or 1) < 2 else _second_process()
    try:
        _run_a_small_world()
    finally:
        if second is not None:
            second.kill()
            second.wait()


def _second_process() -> subprocess.Popen[bytes] | None:
    """Another process that warms up from behind. It is a help only: where it cannot be had, all takes longer."""
    command = [sys.executable, "-c", "from backends.sim.warming import warm_up_from_behind as warm; warm()"]
    nowhere = subprocess.DEVNULL
    try:
        return subprocess.Popen(command, stdin=nowhere, stdout=nowhere, stderr=nowhere, env={**os.environ, **_SAME})  # noqa: S603
    except OSError:
        return None


def _run_a_small_world() -> None:
    import numpy as np

    from backends.sim.kernels.errands import pulled_straight
    from backends.sim.kernels.grid import value_at
    from backends.sim.simulator import Simulator

    world = Simulator(_small_setup())
    world.go(Goal(1, Pose(4.0, 1.0, 0.0), 0.5))
    _pass(world, 4.0)
    world.ease_back(1, 0.1)
    world.clear(2, 3.0)
    world.replan(3)
    world.relocate(4, None)
    _pass(world, 8.0)
    value_at(world.world.distance, 1.0, 1.0)
    pulled_straight(np.zeros((2, 2)), world.world.walkable, 0.3)  # nobody goes round a corner in a room of one


def warm_up_from_behind() -> None:
    """Use the kernels that the small world needs last first: to localize, to follow, to forget."""
    import numpy as np

    from backends.sim.sensing import Scan
    from backends.sim.simulator import Simulator

    setup = _small_setup()
    world, lidar = Simulator(setup), setup.robot.lidar
    robot, memory, beams = world.robot, world.memory, np.full(lidar.beams, 1.0)
    step = lidar.field_of_view / (lidar.beams - 1)
    scan = Scan(beams, -lidar.field_of_view / 2.0, step, lidar.forward, (0.0, 0.0, 0.0), beams.copy(), False)
    robot.ease_back(1, 0.1, 0.0)
    robot.think(0.0)
    world.localization.relocate(None)
    for second in range(4):
        world.localization.predict()
        world.localization.correct(scan, float(second))
    route = robot._planner.straight(memory.field, robot.pose, Pose(4.0, 1.0, 0.0))
    robot._follower.steer(memory.field, route, 0.0, robot.pose, Pose(4.0, 1.0, 0.0), 0.5)
    for _ in range(4):  # until it is taken for more than a glimpse
        memory.take(scan, robot.pose)
    robot.caution.fastest(route, 0.0, robot.pose)
    memory.shown(robot.pose)
    robot.clear(2, 3.0, 0.0)
    robot.halt(0.0)
    robot.go(Goal(1, Pose(4.0, 1.0, 0.0), 0.5), 0.0)
    robot.think(0.0)


def _pass(world: Backend, until: float) -> None:
    while world.clock.now() < until:
        world.reports(until)


def _small_setup() -> Setup:
    corners = ((0.0, 0.0), (5.0, 0.0), (5.0, 3.0), (0.0, 3.0), (0.0, 0.0))
    places = (Place("a", Pose(1.0, 2.0, 0.0)), Place("b", Pose(4.0, 2.0, 0.0)))
    return Setup(
        site=Site("small", 5.0, 3.0, (Wall(corners, 0.1),), (), (), places),
        robot=RobotDescription(
            "small", ((0.2, 0.2), (-0.2, 0.2), (-0.2, -0.2), (0.2, -0.2)), 0.5, 0.3, 0.5, 1.0, 2.0,
            Lidar(4.0, 60, 8.0, 10.0, 0.01, dropouts=0.01, beam_width=0.01, height=0.1),
            Battery(100.0, 10.0, 50.0, 100.0), posts=(Post((0.1, 0.1), 0.02),), sweep=Sweep(1.5, 20, 3.0),
        ),
        start=Pose(1.0, 1.0, 0.0),
        conditions=Conditions(
            cartons=(Carton((2.5, 1.2), (0.3, 0.3)),), walkers=(Walkers(2, together=2),),
            uneven_floor=0.01, doors_shut_by_people=0.5, bystanders=(Bystander((4.5, 2.5), until_s=2.0),),
        ),
        seed=1,
        begins=datetime(2024, 1, 1, 18, 0),
    )  # fmt: skip
