"""Driving straight backward, slowly, as far as it is free: how a robot gets out of a tight spot.

The lidar may not see backward, so this goes by memory and map; what they miss, the wheels find out.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from backends.sim.body import FREE, Body
from backends.sim.follower import MARGIN_M
from backends.sim.kernels.motion import admissible
from backends.sim.kernels.window import free_straight
from runner.site.values import Pose

SLOW_M_S = 0.2
DONE_M = 0.02
"""This near to the distance asked for counts as all of it."""

LITTLE_M = 0.05
"""Less than this is as good as not having moved."""

Answer = tuple[int, bool, str]
"""Action id, whether done, and the reason where not."""


class Easing:
    """One drive backward at a time."""

    def __init__(self, body: Body) -> None:
        self._body = body
        self._action: int | None = None
        self._distance = 0.0
        self._began_at = 0.0
        self._hit = False

    @property
    def active(self) -> bool:
        return self._action is not None

    def begin(self, action_id: int, distance: float) -> None:
        """Begin from wherever the robot is; it first stops if it is driving."""
        self._action, self._distance, self._hit = action_id, distance, False
        self._began_at = self._body.driven

    def stop(self) -> int | None:
        """Give up; the id of the action given up, if there was one."""
        action, self._action = self._action, None
        return action

    def advance(self, field: NDArray[np.float32], pose: Pose) -> tuple[float, Answer | None]:
        """The speed wanted now (0 or below), and the answer once the drive has ended."""
        drive, outline = self._body.drive, self._body.outline
        if drive.speed > 0.0 or drive.side != 0.0 or (drive.turn != 0.0 and drive.speed == 0.0):
            self._began_at = self._body.driven
            return 0.0, None
        done = self._body.driven - self._began_at
        left = self._distance - done
        self._hit = self._hit or (self._body.met != FREE and done > 0.0)
        free = 0.0
        if left > 0.0:
            free = free_straight(
                field, outline.rim, outline.inner, outline.outer,
                pose.x, pose.y, pose.heading, -left, MARGIN_M,
            )  # fmt: skip
        if left > DONE_M and free > 0.0 and not self._hit:
            slow = min(
                SLOW_M_S,
                drive.limits.reverse_speed,
                admissible(max(min(left, free), 0.01), drive.limits.acceleration * 0.5),
            )
            return -slow, None
        return 0.0, self._answer(done) if drive.still else None

    def _answer(self, done: float) -> Answer:
        action = self.stop()
        assert action is not None
        if done >= self._distance - 2.0 * DONE_M:
            return action, True, ""
        if done < LITTLE_M:
            return action, False, "There is no room behind the robot."
        return action, True, f"Only {done:.2f} m were free behind the robot."
