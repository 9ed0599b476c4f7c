"""Driving along a route: what speeds to ask of the drive now. The arithmetic is in `kernels.window`.

The robot turns in place where the route points well off its heading, else takes the best arc of the dynamic window,
and turns to the goal's heading at the end. It never asks for a motion that its whole outline is not believed to be
free for; where there is none, it stands.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.drive import Drive
from backends.sim.kernels.motion import admissible, wrapped
from backends.sim.kernels.path import point_at
from backends.sim.kernels.window import choose, free_turn
from backends.sim.outline import Outline
from backends.sim.parts import STAND, Way, Wish
from runner.site.values import Pose

MARGIN_M = 0.12
"""Believed distance to keep between the rim and the middle of an obstacle's cell: at least 5 cm to the cell itself."""
WINDOW_S = 0.3
"""Candidates of the dynamic window are what can be reached within this."""
HORIZON_S = 1.6
"""How long an arc is looked at, at least; longer where stopping takes longer."""
LOOK_AHEAD_M = 0.4
"""Where on the route the robot looks to decide whether to turn in place."""
TURN_FROM, TURN_UNTIL = math.radians(50.0), math.radians(12.0)
"""Turning in place begins and ends at these angles between heading and route."""
NEAR_GOAL_M, AT_GOAL_M = 0.08, 0.12
"""At the goal: when turning to its heading begins, and how far off counts as arrived."""
AT_HEADING = math.radians(4.0)
"""How far off the heading counts as arrived."""
OVERSHOT, GLANCE = 0.5, 0.2
"""Radians: an error this small in the other direction is an overshoot; how far ahead a turn is looked at."""
GLIDE_M = 1.2
"""A drive that can go sideways does not turn toward a goal that is this near."""
POINTING_M = 0.5
"""Meters of way that pointing square off the route is worth."""
EASY = 0.7
"""Share of the drive's deceleration used to stop at an expected point."""


class DynamicWindow:
    """Follows one route at a time."""

    def __init__(self, outline: Outline, drive: Drive) -> None:
        self._outline = outline
        self._drive = drive
        limits = drive.limits
        self._horizon = max(HORIZON_S, limits.speed / limits.acceleration * 0.5 + 0.4)
        self._turning = 0.0
        self._aligning = False

    def begin(self) -> None:
        """There is a new route; the robot is at its start."""
        self._turning = 0.0
        self._aligning = False

    def steer(
        self, field: NDArray[np.float32], way: Way, covered: float, pose: Pose, goal: Pose, fastest: float
    ) -> Wish:
        """What to do now. `fastest` caps the drive's own limit."""
        away = math.hypot(goal.x - pose.x, goal.y - pose.y)
        if away < (AT_GOAL_M if self._aligning else NEAR_GOAL_M):
            return self._align(field, pose, goal)
        self._aligning = False
        x, y = point_at(way.points, way.along, covered + LOOK_AHEAD_M)
        error = wrapped(math.atan2(y - pose.y, x - pose.x) - pose.heading)
        if not self._glides(max(way.length - covered, away)) and self._is_turn(field, pose, error):
            return self._turn(error)
        return self._drive_arc(field, way, covered, pose, fastest, max(way.length - covered, away))

    def _align(self, field: NDArray[np.float32], pose: Pose, goal: Pose) -> Wish:
        error = wrapped(goal.heading - pose.heading)
        if not self._aligning:
            self._aligning, self._turning = True, 0.0
        if abs(error) < AT_HEADING:
            self._turning = 0.0
            return Wish(0.0, 0.0, arrived=self._drive.still)
        self._choose_direction(field, pose, error)
        return self._turn(error)

    def _is_turn(self, field: NDArray[np.float32], pose: Pose, error: float) -> bool:
        """Decide whether to turn in place, and which way."""
        if abs(error) < (TURN_UNTIL if self._turning else TURN_FROM):
            self._turning = 0.0
        else:
            self._choose_direction(field, pose, error)
        return self._turning != 0.0

    def _choose_direction(self, field: NDArray[np.float32], pose: Pose, error: float) -> None:
        """Choose where no choice was made, where it turned out not to be free, or where the turn went too far."""
        too_far = self._turning * error < 0.0 and abs(error) < OVERSHOT
        if not self._turning or too_far or not self._is_free(field, pose, self._turning * GLANCE):
            self._turning = self._free_direction(field, pose, error)

    def _free_direction(self, field: NDArray[np.float32], pose: Pose, error: float) -> float:
        """Which way to turn to be rid of an error: the short way, else the long way, else none (0)."""
        if self._is_free(field, pose, error):
            return math.copysign(1.0, error)
        other = error - math.copysign(2.0 * math.pi, error)
        return math.copysign(1.0, other) if self._is_free(field, pose, other) else 0.0

    def _is_free(self, field: NDArray[np.float32], pose: Pose, angle: float) -> bool:
        outline = self._outline
        free = free_turn(
            field,
            outline.rim,
            outline.inner,
            outline.outer,
            pose.x,
            pose.y,
            pose.heading,
            angle,
            MARGIN_M,
        )
        return bool(free >= abs(angle) - 1e-9)

    def _turn(self, error: float) -> Wish:
        """Turn in the chosen direction, once standing, slowing down toward the end."""
        if not self._turning or self._drive.speed != 0.0 or self._drive.side != 0.0:
            return STAND
        left = error * self._turning
        left = left if left >= 0.0 else left + 2.0 * math.pi
        limits = self._drive.limits
        rate = min(limits.turn_speed, float(admissible(left, EASY * limits.turn_acceleration)))
        return Wish(0.0, self._turning * rate)

    def _drive_arc(
        self, field: NDArray[np.float32], way: Way, covered: float, pose: Pose, fastest: float, left: float
    ) -> Wish:
        limits, drive = self._drive.limits, self._drive
        outline = self._outline
        fastest = min(fastest, limits.speed, float(admissible(left, EASY * limits.acceleration)))
        turn_speed, pointing = (0.0, 0.0) if self._glides(left) else (limits.turn_speed, POINTING_M)
        speed, side, turn, _ = choose(
            field, outline.rim, outline.inner, outline.outer, MARGIN_M,
            way.points, way.along, covered, pose.x, pose.y, pose.heading,
            drive.speed, drive.side, drive.turn, fastest, limits.acceleration, limits.sideways_speed,
            turn_speed, limits.turn_acceleration, WINDOW_S, self._horizon, pointing,
        )  # fmt: skip
        return Wish(speed, turn, side=side)

    def _glides(self, left: float) -> bool:
        """Whether the robot goes there without turning toward it: a short way, and it can go sideways."""
        return self._drive.limits.sideways_speed > 0.0 and left <= GLIDE_M
