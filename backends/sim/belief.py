"""Where the robot believes it is: for now, the true pose with a small error that wanders slowly."""

from __future__ import annotations

import math

import numpy as np

from runner.site.values import Pose

POSITION_M, HEADING = 0.012, 0.004
"""Standard deviation of the error, meters along x and y, and radians."""
WANDER_S = 3.0
"""Time constant of the error (an Ornstein-Uhlenbeck process): it forgets where it was in a few of these."""


class Localization:
    """The believed pose, tick by tick."""

    def __init__(self, generator: np.random.Generator, tick: float) -> None:
        self._random = generator
        self._keep = math.exp(-tick / WANDER_S)
        renewed = math.sqrt(1.0 - self._keep**2)
        self._along, self._turned = POSITION_M * renewed, HEADING * renewed
        self._error = (0.0, 0.0, 0.0)

    @property
    def spread(self) -> float:
        """Standard deviation of the believed position, meters."""
        return POSITION_M

    def estimate(self, true: Pose) -> Pose:
        """The believed pose one tick on."""
        keep, (x, y, heading), (a, b, c) = self._keep, self._error, self._random.standard_normal(3).tolist()
        x, y = keep * x + self._along * a, keep * y + self._along * b
        heading = keep * heading + self._turned * c
        self._error = (x, y, heading)
        return Pose(true.x + x, true.y + y, true.heading + heading)

    def begin_anew(self) -> None:
        """The robot finds out where it is: the error starts from nothing."""
        self._error = (0.0, 0.0, 0.0)
