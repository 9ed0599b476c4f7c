"""Where the robot is on its route."""

from __future__ import annotations

from backends.sim.kernels.path import project
from backends.sim.parts import Way
from runner.site.values import Pose

BACK_M, FORTH_M = 1.0, 1.5
"""How far behind and ahead of where it was the robot looks for itself on the route."""


class Track:
    """`covered` is how far along its route the robot is, `off` how far beside it, meters."""

    def __init__(self) -> None:
        self.covered = 0.0
        self.off = 0.0

    def begin(self) -> None:
        """There is a new route; the robot is at its start."""
        self.covered = self.off = 0.0

    def locate(self, way: Way, pose: Pose) -> None:
        """Find the robot on its route."""
        self.covered, self.off = project(
            way.points, way.along, pose.x, pose.y, max(self.covered - BACK_M, 0.0), self.covered + FORTH_M
        )
