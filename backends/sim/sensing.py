"""The robot's eyes: a planar lidar, cast against what is truly there."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.rays import scan
from runner.site.values import Lidar, Pose

FULL_CIRCLE = 2.0 * math.pi - 1e-6


@dataclass(frozen=True, slots=True)
class Scan:
    """One scan in the robot frame: beam i points to `first` + i * `step`; infinity where nothing came back.

    The ranges are reused by the next scan.
    """

    ranges: NDArray[np.float64]
    first: float
    step: float
    forward: float
    """How far ahead of the turning center it was taken, meters."""

    def origin(self, pose: Pose) -> tuple[float, float, float]:
        """Where the lidar is, and the direction of beam 0, with the robot at a pose."""
        x = pose.x + self.forward * math.cos(pose.heading)
        y = pose.y + self.forward * math.sin(pose.heading)
        return x, y, pose.heading + self.first


class Scanner:
    """Takes scans with the noise of its generator."""

    def __init__(self, lidar: Lidar, generator: np.random.Generator) -> None:
        self._lidar = lidar
        self._random = generator
        gaps = lidar.beams if lidar.field_of_view >= FULL_CIRCLE else max(lidar.beams - 1, 1)
        self._scan = Scan(
            np.full(lidar.beams, np.inf), -lidar.field_of_view / 2.0, lidar.field_of_view / gaps, lidar.forward
        )

    def look(self, pose: Pose, distance: NDArray[np.float32], people: NDArray[np.float64]) -> Scan:
        """The scan from the true pose. `distance` is the world's, `people` rows of (x, y, radius)."""
        x, y, first = self._scan.origin(pose)
        scan(
            distance, people, x, y, first, self._scan.step, self._lidar.range_max, self._lidar.noise,
            self._random, self._scan.ranges,
        )  # fmt: skip
        return self._scan
