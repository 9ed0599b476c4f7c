"""The robot as it really is: where it stands, how it moves, what stops it, what its battery holds."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.battery import Charge
from backends.sim.drive import Drive
from backends.sim.kernels.overlap import FREE, PERSON, SOLID, covers_solid, moved
from backends.sim.outline import Outline, outline_of
from backends.sim.world import World
from runner.site.values import Pose, RobotDescription

__all__ = ["FREE", "PERSON", "SOLID", "Body"]


class Body:
    """`place` is the true (x, y, heading); `driven` the path length; `met` what stopped the last motion short."""

    def __init__(self, robot: RobotDescription, start: Pose, world: World) -> None:
        """ValueError where the robot does not fit at the start."""
        self.outline: Outline = outline_of(robot.footprint)
        self.place = np.array([start.x, start.y, start.heading], dtype=np.float64)
        self.drive = Drive(robot)
        self.charge = Charge(robot.battery, robot.battery.capacity)
        self.driven = 0.0
        self.met = FREE
        if covers_solid(world.blocked, self.outline.hull, start.x, start.y, start.heading):
            raise ValueError(f"The robot cannot begin at {start.x:.2f} m, {start.y:.2f} m: it would stand in a wall.")

    @property
    def pose(self) -> Pose:
        x, y, heading = self.place.tolist()
        return Pose(x, y, heading)

    def advance(self, world: World, people: NDArray[np.float64], speed: float, turn: float, time: float) -> None:
        """Drive toward the wanted speeds for one tick, as far as it is really free. A hit stops the wheels at once."""
        if self.charge.empty:
            speed = turn = 0.0
        self.drive.toward(speed, turn, time)
        self.met = FREE
        driving = not self.drive.still
        if driving:
            self.charge.charging = False
            self._move(world, people, time)
        self.charge.spend(driving, time)

    def _move(self, world: World, people: NDArray[np.float64], time: float) -> None:
        x, y, _ = self.place.tolist()
        self.met = moved(
            world.blocked, world.distance, people, self.outline.hull, self.outline.outer, self.place,
            self.drive.speed, self.drive.turn, time,
        )  # fmt: skip
        if self.met == FREE:
            self.driven += abs(self.drive.speed) * time
            return
        self.driven += math.hypot(self.place[0] - x, self.place[1] - y)
        self.drive.stop()
