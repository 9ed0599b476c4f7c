"""Compiling every kernel before time counts, by running a small world in which all of them are needed."""

from __future__ import annotations

from datetime import datetime

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


def warm_up() -> None:
    """Use every kernel once. About half a minute after an installation; then they are kept (`runner.site.compiled`)."""
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
