"""What really is the case: where the robot is and why it stands or gets on badly. For scoring; the robot never asks.

What is wrong with the robot comes before what is in its way. In the way is what really stands on the next meters of
its route where it stands or believes it obstructed, or, where it has none, first on the way that the map has.
"""

from __future__ import annotations

import math
from collections import deque

import numpy as np
from numpy.typing import NDArray

from backends.contract import Cause, Truth
from backends.sim.body import Body
from backends.sim.in_the_way import Points, first_in_the_way
from backends.sim.kernels.overlap import covers_solid
from backends.sim.kernels.weights import halved
from backends.sim.memory import Memory
from backends.sim.planner import find_halved
from backends.sim.robot import Robot
from backends.sim.trouble import Trouble
from backends.sim.world import World
from runner.site.values import CELL_M, Pose

BETWEEN_LOOKS_TICKS = 10
EVERY_S = 1.0
"""Between two truths at least, while the cause stays the same and the robot is under way."""
SLOW, SLOW_TURN = 0.1, 0.1
"""Slower than this, m/s and rad/s, it stands."""
AHEAD_M, BEYOND_M = 2.0, 1.0
"""Where it stands, what is so far ahead is in its way; where it believes its route obstructed, all up to there and a
little beyond."""
EVERY_POINT = 2
"""Of a route, whose points are 0.1 m apart, this is enough."""
WEDGED_M = 0.04
"""Nearer than this to something solid the robot is up against it."""
THERE_M, AFTERWARDS_S = 0.3, 60.0
"""A goal farther off than this was not got to; it counts as trouble for so long after it ended, until the next."""
ASTRAY_M, ASTRAY = 0.5, math.radians(20.0)
"""Farther from where it believes to be, it does not know where it is."""
MOST_KEPT = 100_000
"""Where nobody asks for them, the oldest are dropped."""


class Witness:
    """Watches one robot in its world."""

    def __init__(self, world: World, body: Body, robot: Robot, memory: Memory, trouble: Trouble) -> None:
        self._world = world
        self._body = body
        self._robot = robot
        self._memory = memory
        self._trouble = trouble
        self._goal: Pose | None = None
        self._map_way: Points | None = None
        self._carried = False
        self._idle_since: float | None = None
        self._told = Truth(-math.inf, body.pose, Cause.NOTHING)
        self._truths: deque[Truth] = deque(maxlen=MOST_KEPT)

    def head_for(self, goal: Pose) -> None:
        """The robot has been sent to a pose on the map."""
        self._goal, self._map_way = goal, None

    def carried(self) -> None:
        """Somebody has carried the robot."""
        self._carried = True

    def look(self, now: float, people: NDArray[np.float64]) -> None:
        """See what is the case; `people` has rows (x, y, radius). To be called every `BETWEEN_LOOKS_TICKS` ticks."""
        idle = not self._is_about_something(now)
        cause = self._cause(idle, people)
        if cause is self._told.cause and (idle or now - self._told.stamp < EVERY_S):
            return
        self._told = Truth(now, self._body.pose, cause)
        self._truths.append(self._told)

    def take(self) -> list[Truth]:
        """What was seen since the last time."""
        taken = list(self._truths)
        self._truths.clear()
        return taken

    def _is_about_something(self, now: float) -> bool:
        """Whether it has a goal, or had one until lately that it did not get to: the trouble is not over then."""
        if not self._robot.idle:
            self._idle_since = None
            return True
        if self._idle_since is None:
            self._idle_since, self._map_way = now, None
        goal, believed = self._goal, self._robot.pose
        if goal is None or now - self._idle_since > AFTERWARDS_S:
            return False
        return math.hypot(goal.x - believed.x, goal.y - believed.y) > THERE_M

    def _cause(self, idle: bool, people: NDArray[np.float64]) -> Cause:
        wrong = self._wrong()
        if wrong is not Cause.NOTHING or idle:
            return wrong
        obstructed, stands = self._obstruction(), self._stands()
        if obstructed is None and not stands:
            return wrong
        found = self._in_the_way(people, AHEAD_M if obstructed is None else obstructed + BEYOND_M)
        return Cause.WEDGED if found is Cause.NOTHING and stands and self._is_wedged() else found

    def _wrong(self) -> Cause:
        trouble = self._trouble
        astray = self._is_astray()
        self._carried = self._carried and astray
        causes = (
            (self._body.charge.empty, Cause.BATTERY),
            (trouble.stopped, Cause.STOPPED),
            (trouble.wheels_stuck, Cause.WHEELS_STUCK),
            (trouble.lidar_blind, Cause.BLIND),
            (self._carried, Cause.CARRIED),
            (trouble.slip > 0.0, Cause.SLIP),
            (astray, Cause.ASTRAY),
            (trouble.silent, Cause.SILENT),
        )
        return next((cause for holds, cause in causes if holds), Cause.NOTHING)

    def _is_astray(self) -> bool:
        believed, true = self._robot.pose, self._body.pose
        if math.hypot(believed.x - true.x, believed.y - true.y) > ASTRAY_M:
            return True
        return abs(math.remainder(believed.heading - true.heading, 2.0 * math.pi)) > ASTRAY

    def _stands(self) -> bool:
        drive = self._body.drive
        return abs(drive.speed) < SLOW and abs(drive.side) < SLOW and abs(drive.turn) < SLOW_TURN

    def _obstruction(self) -> float | None:
        """How far ahead the robot believes its route to be obstructed, if it does."""
        route, covered = self._robot.route, self._robot.track.covered
        at = None if route is None else route.obstruction(self._memory.field, covered)
        return None if at is None else at - covered

    def _in_the_way(self, people: NDArray[np.float64], ahead: float) -> Cause:
        points, body = self._way_ahead(ahead), self._body
        return first_in_the_way(points, body.pose, body.outline, self._world, self._memory, people)

    def _is_wedged(self) -> bool:
        """Whether something solid is so near to the outline that the robot hardly dares to move."""
        body = self._body
        wider = body.outline.hull * (1.0 + WEDGED_M / body.outline.inner)
        return bool(covers_solid(self._world.blocked, wider, *body.place.tolist()))

    def _way_ahead(self, length: float) -> Points:
        """Points of the next meters, some cells apart: of the robot's route, or of the map's whole way to the goal."""
        route = self._robot.route
        if route is not None:
            covered = self._robot.track.covered
            ahead = (route.along >= covered) & (route.along <= covered + length)
            return route.points[ahead][::EVERY_POINT]
        if self._map_way is None and self._goal is not None:
            weight = halved(self._memory.known, self._body.outline.inner + CELL_M, self._body.outline.outer + 0.3, 8.0)
            found = find_halved(weight, (self._robot.pose.x, self._robot.pose.y), (self._goal.x, self._goal.y))
            self._map_way = np.empty((0, 2)) if found is None else found
        return np.empty((0, 2)) if self._map_way is None else self._map_way
