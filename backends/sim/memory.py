"""What the robot remembers having seen that its map does not know.

Hits add evidence; only a beam that passes through and comes back from beyond takes it away; `forget` drops all of it
within a radius. So a carton taken from the middle of a long corridor, where the beams find nothing to come back from,
stays remembered until the robot is told to clear. The map's own walls are kept apart and never forgotten.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.evidence import fade, forget, near, repaint, take_hits
from backends.sim.outline import Outline
from backends.sim.sensing import Scan
from runner.site.floor import clearance
from runner.site.values import CELL_M, Lidar, Point, Pose

TRUST_M = 5.0
"""Returns from farther away are not remembered: a small error in heading would put them in the wrong place."""
TOLERANCE_M = 0.1
"""A return this near a mapped cell (and 1 % of its range more, and four deviations of noise at least) is the map's."""
LONGEST_MEMORY_S = 30.0
"""Evidence is capped at so many seconds of scans: what stood long is forgotten after this long in plain view."""
PAINT_M = 0.2
"""How far beyond the circumscribed radius remembered cells show in the distance field."""
MOST_CELLS = 1 << 14
SCANS_PER_REPAINT = 4
"""Every so many scans the distance field forgets what the memory forgot (together that costs less), and the memory what
it has where the robot itself stands."""
NO_OUTLINE = np.empty((0, 2))
SHOWN_M, SHOWN_MOST = 4.0, 64
"""Obstacles reported in telemetry: how near, and how many at most."""


class Memory:
    """`known` is the map's distance field, `field` that of map and memory together: meters between cell centers."""

    def __init__(self, mapped: NDArray[np.bool_], outline: Outline, lidar: Lidar) -> None:
        self.known = clearance(mapped)
        self.field = self.known.copy()
        self._evidence = np.zeros(mapped.shape, dtype=np.int32)
        self._seen = np.full(mapped.shape, -1, dtype=np.int32)
        self._cells = np.zeros(MOST_CELLS, dtype=np.int64)
        self._disc = _disc(outline.outer + PAINT_M)
        self._shown = np.zeros((SHOWN_MOST, 2))
        self._cap = max(1, round(LONGEST_MEMORY_S * lidar.rate))
        self._tolerance = max(TOLERANCE_M, 4.0 * lidar.noise)
        self._reach = lidar.range_max
        self._outline = outline
        self._lost = np.zeros(MOST_CELLS, dtype=np.int64)
        self._gone = 0
        self._scans = 0
        self.count = 0

    def take(self, scan: Scan, pose: Pose) -> None:
        """Learn from a scan taken where the robot believes it is."""
        x, y, first = scan.origin(pose)
        self._scans += 1
        self.count = take_hits(
            scan.ranges, x, y, first, scan.step, TRUST_M, self._tolerance, self.known, self._evidence, self._seen,
            self._scans, self._cap, self._cells, self.count, self.field, self._disc,
        )  # fmt: skip
        if self.count:
            self.count, self._gone = fade(
                scan.ranges, x, y, first, scan.step, self._reach, self._evidence, self._seen, self._scans,
                self._cells, self.count, self._lost, self._gone,
            )  # fmt: skip
        if self._scans % SCANS_PER_REPAINT == 0 or self._gone == len(self._lost):
            self._drop(pose, self._outline.outer, self._outline.hull)

    def _repaint(self) -> None:
        """Make the field right after cells were forgotten."""
        repaint(self.field, self.known, self._disc, self._cells, self.count, self._lost[: self._gone])
        self._gone = 0

    def forget(self, pose: Pose, radius: float) -> int:
        """Forget all within a radius of the robot; how many cells that were."""
        return self._drop(pose, float(radius), NO_OUTLINE)

    def _drop(self, pose: Pose, radius: float, outline: NDArray[np.float64]) -> int:
        """Forget within a radius, or what of that is under an outline that has corners."""
        if self._gone:
            self._repaint()
        before = self.count
        if before:
            self.count = forget(
                pose.x, pose.y, pose.heading, radius, outline, self.known, self._evidence, self._cells, before,
                self.field, self._disc,
            )  # fmt: skip
        return before - self.count

    def shown(self, pose: Pose) -> tuple[Point, ...]:
        """Centers of remembered cells near the robot, thinned."""
        if not self.count:
            return ()
        filled = near(pose.x, pose.y, SHOWN_M, self._cells, self.count, self.field.shape[1], self._shown)
        return tuple((x, y) for x, y in self._shown[:filled].tolist())


def _disc(radius: float) -> NDArray[np.float32]:
    """Distances of a square patch of cells from its middle; infinite beyond the radius."""
    reach = math.ceil(radius / CELL_M)
    offsets = np.arange(-reach, reach + 1) * CELL_M
    distances = np.hypot(offsets[:, None], offsets[None, :])
    return np.where(distances <= radius, distances, np.inf).astype(np.float32)
