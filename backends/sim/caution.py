"""How fast the robot may drive so that it can stop within the space that it sees, which makes it slow at blind corners.

v <= sqrt(2 d a), the admissible speed of the dynamic window (Fox, Burgard and Thrun, 1997), with d the way to where the
space that it will cover is out of sight or unseen.
"""

from __future__ import annotations

import math

from backends.sim.kernels.grid import value_at
from backends.sim.kernels.motion import admissible
from backends.sim.kernels.sight import seen_length
from backends.sim.memory import Memory
from backends.sim.outline import Outline
from backends.sim.planner import Route
from runner.site.values import Pose, RobotDescription, UnseenSpace

CREEP_M_S = 0.1
"""However little it sees, this slowly it goes on: it stops within a centimeter, and sees more as it goes."""
SLOW_M_S = 0.2
"""Through unseen space, where it is told to drive there."""
REACTION_S = 0.2
"""From the scan to the brakes: a tick until it is used and one until the wheels obey."""
MAPPED_SHARE = 0.65
"""A wall nearer than this share of the range comes into view even where it is right behind a lidar of 270 degrees."""
EASY = 0.7
"""Share of the drive's deceleration that is counted on."""
BERTH_M = 0.4
"""How far beside its way the robot wants to see the floor: somebody may stand there."""
SPARE_M = 0.1
"""How much farther than needed to stop from full speed the robot looks along its route."""


class Caution:
    """The speed cap of one robot."""

    def __init__(self, robot: RobotDescription, outline: Outline, memory: Memory) -> None:
        self._memory = memory
        self._half = outline.inner
        self._front = max(float(outline.hull[:, 0].max()) - outline.inner, 0.0)
        self._limits = robot
        self._braking = EASY * robot.acceleration
        self._enough = self.needed(robot.speed) + SPARE_M
        self._slowest_unseen = SLOW_M_S if robot.unseen_space is UnseenSpace.DRIVE_SLOWLY else 0.0
        self.seen = self._enough
        """How far along its route the robot saw when it was last asked, at most what it needs to see."""

    def needed(self, speed: float) -> float:
        """How far the route must be seen for a speed: the way to stop, what passes before, and the robot's nose."""
        return speed * speed / (2.0 * self._braking) + REACTION_S * speed + self._front

    def fastest(self, route: Route, covered: float, pose: Pose) -> float:
        """The highest speed now, m/s."""
        memory, scan = self._memory, self._memory.scan
        if scan is None:
            return CREEP_M_S
        x, y, first = scan.origin(pose)
        self.seen, clear = seen_length(
            route.points, route.along, covered, self._enough, scan.sight, x, y, first, scan.step, self._half, BERTH_M,
            pose.x, pose.y, memory.known, memory.is_unseen(),
        )  # fmt: skip
        return min(max(self._within(self.seen), CREEP_M_S), max(self._within(clear), self._slowest_unseen))

    def is_blind(self, pose: Pose) -> bool:
        """Whether nothing came back although something must: the robot's own posts, or a wall that the map has near."""
        scan = self._memory.scan
        if scan is None or not scan.blind:
            return False
        near: float = value_at(self._memory.known, pose.x, pose.y)
        return bool(self._limits.posts) or near < MAPPED_SHARE * self._limits.lidar.range_max

    def _within(self, length: float) -> float:
        """The speed from which the robot stops within a length of its route, having reacted."""
        left = length - self._front
        if left <= 0.0:
            return 0.0
        fast = float(admissible(left, self._braking))
        lag = REACTION_S * self._braking
        return math.sqrt(lag * lag + fast * fast) - lag
