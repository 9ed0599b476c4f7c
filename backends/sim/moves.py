"""Moves seen from the robot: by odometry and the last scan alone, with no map and no memory.

All is put into a frame of its own, a square of floor with the robot in the middle, so that it makes no difference where
the robot believes to be, or whether it knows.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from backends.sim.frames import relative, seen_from
from backends.sim.sensing import Scan
from runner.site.floor import clearance
from runner.site.values import CELL_M, Pose

HALF_M = 5.0
"""Half a side of the square: more than the robot looks ahead and needs to stop. Its edge counts as solid."""


class Move:
    """One move, from where odometry had the robot when it was asked for to the pose seen from there."""

    def __init__(self, odometry: Pose, ahead: Pose) -> None:
        self._start = odometry
        self._end = seen_from(odometry, (ahead.x, ahead.y, ahead.heading))

    def seen_at(self, here: Pose, odometry: Pose) -> tuple[Pose, Pose]:
        """Start and end for a robot taken to be at `here` in some frame while odometry has it at `odometry`."""
        start, end = (seen_from(here, relative(odometry, one)) for one in (self._start, self._end))
        return start, end


MIDDLE = Pose(HALF_M, HALF_M, 0.0)
"""Where the robot is in its square."""


def square_of(scan: Scan) -> NDArray[np.float32]:
    """A distance field of the square around the robot: meters to the nearest return of the scan."""
    side = round(2.0 * HALF_M / CELL_M)
    x, y, first = scan.origin(MIDDLE)
    near = scan.ranges < 2.0 * HALF_M
    ranges, angles = scan.ranges[near], first + np.flatnonzero(near) * scan.step
    columns = ((x + ranges * np.cos(angles)) / CELL_M).astype(np.int64)
    rows = ((y + ranges * np.sin(angles)) / CELL_M).astype(np.int64)
    inside = (columns >= 0) & (columns < side) & (rows >= 0) & (rows < side)
    solid = np.zeros((side, side), dtype=np.bool_)
    solid[rows[inside], columns[inside]] = True
    return clearance(solid)
