"""What the wheels say of the robot's motion: where it is in a frame that begins where it began, and how sure that is.

The velocity motion model of Thrun, Burgard and Fox (Probabilistic Robotics, 2005, table 5.3), whose parameters hold
for a step of 0.1 s: the wheels measure speeds with noise, and a last turn on the spot. What the wheels do not feel is
not in it: slip, a bump, being carried.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from backends.sim.kernels.motion import glide
from runner.site.values import Odometry, Pose


@dataclass(slots=True)
class Doubt:
    """Variances of what the wheels said since somebody last asked: of the way, the turn, last turns on the spot."""

    way: float = 0.0
    turn: float = 0.0
    last: float = 0.0


class Wheels:
    """`pose` in the frame of odometry; `doubt` collects until `ask` takes it."""

    def __init__(self, noise: Odometry, generator: np.random.Generator) -> None:
        self._noise = noise
        self._random = generator
        self.pose = Pose(0.0, 0.0, 0.0)
        self.doubt = Doubt()

    def advance(self, speed: float, side: float, turn: float, time: float) -> None:
        """One step in which the wheels really turned for these speeds."""
        noise, doubt = self._noise, self.doubt
        way, angle = math.sqrt(speed * speed + side * side) * time, turn * time
        of_way = math.hypot(noise.way_by_way * way, noise.way_by_turn * angle)
        of_turn = math.hypot(noise.turn_by_way * way, noise.turn_by_turn * angle)
        of_last = math.hypot(noise.last_turn_by_way * way, noise.last_turn_by_turn * angle)
        drawn_way, drawn_turn, drawn_last = self._random.standard_normal(3).tolist()
        off = of_way * drawn_way
        if way > 0.0:
            ahead, left = speed * (1.0 + off / way), side * (1.0 + off / way)
        else:
            ahead, left = off / time, 0.0  # a turn on the spot wanders, too
        here = self.pose
        x, y, heading = glide(here.x, here.y, here.heading, ahead, left, turn + of_turn * drawn_turn / time, time)
        self.pose = Pose(x, y, heading + of_last * drawn_last)
        doubt.way += of_way * of_way
        doubt.turn += of_turn * of_turn
        doubt.last += of_last * of_last

    def ask(self) -> Doubt:
        """The variances since the last time, and begin anew."""
        taken, self.doubt = self.doubt, Doubt()
        return taken
