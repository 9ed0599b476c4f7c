"""The robot as it really is: where it stands, how it moves, what stops it, what its battery holds."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.battery import Charge
from backends.sim.drive import Drive
from backends.sim.kernels.overlap import FREE, PERSON, SOLID, covers_solid, moved
from backends.sim.odometry import Wheels
from backends.sim.outline import Outline, outline_of
from backends.sim.trouble import Trouble
from backends.sim.world import World
from runner.site.values import Pose, RobotDescription

__all__ = ["FREE", "PERSON", "SOLID", "Body"]


class Body:
    """`place` is the true (x, y, heading); `driven` the path length that the wheels turned for; `met` what stopped the
    last motion short; `wheels` what odometry says."""

    def __init__(
        self, robot: RobotDescription, start: Pose, world: World, trouble: Trouble, generator: np.random.Generator
    ) -> None:
        """ValueError where the robot does not fit at the start."""
        self.outline: Outline = outline_of(robot.footprint)
        self.place = np.array([start.x, start.y, start.heading], dtype=np.float64)
        self.drive = Drive(robot)
        self.wheels = Wheels(robot.odometry, generator)
        self._trouble = trouble
        self.charge = Charge(robot.battery, robot.battery.capacity)
        self.driven = 0.0
        self.met = FREE
        if covers_solid(world.blocked, self.outline.hull, start.x, start.y, start.heading):
            raise ValueError(f"The robot cannot begin at {start.x:.2f} m, {start.y:.2f} m: it would stand in a wall.")

    @property
    def pose(self) -> Pose:
        x, y, heading = self.place.tolist()
        return Pose(x, y, heading)

    def carry(self, pose: Pose) -> None:
        """Somebody lifts the robot and puts it down elsewhere; its wheels do not feel it."""
        self.place[:] = (pose.x, pose.y, pose.heading)
        self.drive.stop()

    def advance(
        self, world: World, people: NDArray[np.float64], speed: float, side: float, turn: float, time: float
    ) -> None:
        """Drive toward the wanted speeds for one tick, as far as it is really free. A hit stops the wheels at once."""
        if self.charge.empty:
            speed = side = turn = 0.0
        if self._trouble.stopped or self._trouble.wheels_stuck:
            self.drive.stop()
        else:
            self.drive.toward(speed, side, turn, time)
        self.met = FREE
        driving = not self.drive.still
        if driving:
            self.charge.charging = False
            self._move(world, people, time)
        self.charge.spend(driving, time)

    def _move(self, world: World, people: NDArray[np.float64], time: float) -> None:
        """The floor gives less than the wheels turn for where they slip."""
        drive, grip = self.drive, 1.0 - self._trouble.slip
        x, y, heading = self.place.tolist()
        self.met = moved(
            world.blocked, world.distance, people, self.outline.hull, self.outline.outer, self.place,
            grip * drive.speed, grip * drive.side, grip * drive.turn, time,
        )  # fmt: skip
        if self.met == FREE:
            self.driven += math.sqrt(drive.speed * drive.speed + drive.side * drive.side) * time
            self.wheels.advance(drive.speed, drive.side, drive.turn, time)
            return
        made = self._share_made(x, y, heading, grip * time)
        self.driven += math.hypot(self.place[0] - x, self.place[1] - y)
        if made > 0.0:
            self.wheels.advance(drive.speed, drive.side, drive.turn, made * time)
        drive.stop()

    def _share_made(self, x: float, y: float, heading: float, time: float) -> float:
        """Of the motion wanted in a time, the share made from a pose until something stopped it."""
        drive = self.drive
        way = math.sqrt(drive.speed * drive.speed + drive.side * drive.side) * time
        if way > abs(drive.turn) * self.outline.outer * time:
            return min(math.hypot(self.place[0] - x, self.place[1] - y) / way, 1.0)
        angle = abs(drive.turn) * time
        return min(abs(float(self.place[2]) - heading) / angle, 1.0) if angle > 0.0 else 0.0
