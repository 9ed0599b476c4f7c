"""What the robot remembers having seen that its map does not know: of each cell whether it is occupied, free or unseen.

Hits add evidence; only a beam that passes through and comes back from beyond takes it away; `forget` drops all of it
within a radius. So a carton taken from the middle of a long corridor, where the beams find nothing to come back from,
stays remembered until the robot is told to clear. What was forgotten is unseen, not free, until it has been looked at.
The map's own walls are kept apart and never forgotten; its free floor was surveyed, so it begins as seen.
"""

from __future__ import annotations

import math
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.evidence import BY_LIDAR, BY_SWEEP, fade, forget, near, paint, repaint, reveal, take_hits
from backends.sim.outline import Outline
from backends.sim.sensing import Scan
from runner.site.floor import cell_of, clearance
from runner.site.values import CELL_M, Lidar, Point, Pose, Site, Sweep

TRUST_M = 5.0
"""Returns from farther away are not remembered: a small error in heading would put them in the wrong place."""
TOLERANCE_M = 0.1
"""A return this near a mapped cell (and 1 % of its range more, and four deviations of noise at least) is the map's."""
DISOWNED_M = TRUST_M + 1.0
"""What was seen of late from a wrong pose is within this of it: the robot drove on for a moment until it noticed."""
LONGEST_MEMORY_S = 30.0
"""Evidence is capped at so many seconds of scans: what stood long is forgotten after this long in plain view."""
OPEN_S = 1.0
"""What was cleared is free after so many seconds of beams that run through it and find nothing to come back from."""
PAINT_M = 0.2
"""How far beyond the circumscribed radius remembered cells show in the distance field."""
MOST_CELLS = 1 << 14
SCANS_PER_REPAINT = 4
"""Every so many scans the distance field forgets what the memory forgot (together that costs less), and the memory what
it has where the robot itself stands."""
NO_OUTLINE = np.empty((0, 2))
SHOWN_M, SHOWN_MOST = 4.0, 64
"""Obstacles reported in telemetry: how near, and how many at most."""


class State(IntEnum):
    """What the robot knows of a cell."""

    UNSEEN = 0
    FREE = 1
    OCCUPIED = 2


class Memory:
    """`known` is the map's distance field, `field` that of map and memory together: meters between cell centers.

    `scan` is the last scan taken in, `count` the number of remembered cells, `unseen` that of cleared ones not seen
    since.
    """

    def __init__(
        self, mapped: NDArray[np.bool_], outline: Outline, lidar: Lidar, surveyed: NDArray[np.bool_] | None = None
    ) -> None:
        """`mapped` is solid on the map; `surveyed` the free floor of the map, all of it where nothing else is said."""
        self.known = clearance(mapped)
        self.field = self.known.copy()
        self.scan: Scan | None = None
        self.count = 0
        self.unseen = 0
        self._off_map = np.zeros_like(mapped) if surveyed is None else ~(surveyed | mapped)
        self._evidence = np.zeros(mapped.shape, dtype=np.int32)
        self._by = np.zeros(mapped.shape, dtype=np.int8)
        self._unseen = np.zeros(mapped.shape, dtype=np.int16)
        self._seen = np.full(mapped.shape, -1, dtype=np.int32)
        self._cells = np.zeros(MOST_CELLS, dtype=np.int64)
        self._hidden = np.zeros(MOST_CELLS, dtype=np.int64)
        self._disc = _disc(outline.outer + PAINT_M)
        self._shown = np.zeros((SHOWN_MOST, 2))
        self._rate = lidar.rate
        self._cap = max(1, round(LONGEST_MEMORY_S * lidar.rate))
        self._looks = max(1, round(OPEN_S * lidar.rate))
        self._tolerance = max(TOLERANCE_M, 4.0 * lidar.noise)
        self._reach = lidar.range_max
        self._outline = outline
        self._lost = np.zeros(MOST_CELLS, dtype=np.int64)
        self._gone = 0
        self._scans = 0
        self._number = 0

    # --- seeing -----------------------------------------------------------------------------------------------

    def take(self, scan: Scan, pose: Pose) -> None:
        """Learn from a scan of the lidar; the robot believes that it now is at a pose."""
        self.scan = scan
        if scan.blind:
            return
        x, y, first = scan.origin(pose)
        self._learn(scan.ranges, x, y, first, scan.step, TRUST_M, self._reach, 1, BY_LIDAR)
        if self.unseen:
            self._reveal(scan.sight, x, y, first, scan.step, self._reach)
        self._scans += 1
        if self._scans % SCANS_PER_REPAINT == 0 or self._gone == len(self._lost):
            self._drop(pose, self._outline.outer, self._outline.hull)

    def take_columns(
        self, ranges: NDArray[np.float64], x: float, y: float, first: float, step: float, sweep: Sweep
    ) -> None:
        """Learn from some columns of the sweep, looked at from (x, y); beyond the range where they meet only floor."""
        amount = max(1, round(self._rate * sweep.period))
        self._learn(ranges, x, y, first, step, sweep.range_max, sweep.range_max, amount, BY_SWEEP)
        if self.unseen:
            self._reveal(ranges, x, y, first, step, sweep.range_max)

    def _learn(
        self,
        ranges: NDArray[np.float64],
        x: float,
        y: float,
        first: float,
        step: float,
        trust: float,
        reach: float,
        amount: int,
        sensor: int,
    ) -> None:
        self._number += 1
        self.count = take_hits(
            ranges, x, y, first, step, trust, self._tolerance, self.known, self._evidence, self._seen, self._number,
            amount, self._cap, sensor, self._by, self._unseen, self._cells, self.count, self.field, self._disc,
        )  # fmt: skip
        if self.count:
            self.count, self._gone = fade(
                ranges, x, y, first, step, reach, self._evidence, self._seen, self._number, amount, sensor, self._by,
                self._cells, self.count, self._lost, self._gone,
            )  # fmt: skip

    def _reveal(self, sight: NDArray[np.float64], x: float, y: float, first: float, step: float, reach: float) -> None:
        self.unseen = reveal(sight, x, y, first, step, reach, TRUST_M, self._unseen, self._hidden, self.unseen)

    # --- knowing ----------------------------------------------------------------------------------------------

    def state(self, point: Point) -> State:
        """What is known of a place. What lies outside the floor is unseen."""
        row, column = cell_of(point)
        if not (0 <= row < self.known.shape[0] and 0 <= column < self.known.shape[1]):
            return State.UNSEEN
        if self.known[row, column] == 0.0 or self._evidence[row, column] > 0:
            return State.OCCUPIED
        return State.UNSEEN if self._off_map[row, column] or self._unseen[row, column] > 0 else State.FREE

    def without_unseen(self) -> NDArray[np.float32]:
        """The distance field with unseen cells as good as solid, to plan on. A copy, where there are any."""
        if not self.unseen:
            return self.field
        field, columns = self.field.copy(), self.field.shape[1]
        for cell in self._hidden[: self.unseen].tolist():
            paint(field, self._disc, cell // columns, cell % columns)
        return field

    def is_unseen(self) -> NDArray[np.int16]:
        """A raster, above 0 where the robot has not seen since it cleared there. Not to be changed."""
        return self._unseen

    def shown(self, pose: Pose) -> tuple[Point, ...]:
        """Centers of remembered cells near the robot, thinned."""
        if not self.count:
            return ()
        filled = near(pose.x, pose.y, SHOWN_M, self._cells, self.count, self.field.shape[1], self._shown)
        return tuple((x, y) for x, y in self._shown[:filled].tolist())

    # --- forgetting -------------------------------------------------------------------------------------------

    def forget(self, pose: Pose, radius: float) -> int:
        """Forget all within a radius of the robot, which makes it unseen; how many cells that were."""
        gone = self._drop(pose, float(radius), NO_OUTLINE)
        lost = self._lost[:gone]
        room = min(gone, len(self._hidden) - self.unseen)
        self._unseen.reshape(-1)[lost[:room]] = self._looks
        self._hidden[self.unseen : self.unseen + room] = lost[:room]
        self.unseen += room
        return gone

    def disown(self, pose: Pose) -> None:
        """Take back what was remembered about a pose at which the robot turns out not to be.

        The cells go back to what the map says of them. They were not cleared, so they are not unseen.
        """
        self._drop(pose, DISOWNED_M, NO_OUTLINE)

    def _drop(self, pose: Pose, radius: float, outline: NDArray[np.float64]) -> int:
        """Forget within a radius, or what of that is under an outline that has corners; how many, listed in `_lost`."""
        if self._gone:
            repaint(self.field, self.known, self._disc, self._cells, self.count, self._lost[: self._gone])
            self._gone = 0
        if not self.count:
            return 0
        gone: int = forget(
            pose.x, pose.y, pose.heading, radius, outline, self.known, self._evidence, self._cells, self.count,
            self.field, self._disc, self._lost,
        )  # fmt: skip
        self.count -= gone
        return gone


def surveyed(mapped: NDArray[np.bool_], site: Site, start: Pose) -> NDArray[np.bool_]:
    """The free floor that the map is of: all that hangs together with a place, or with where the robot begins."""
    from scipy.ndimage import label

    parts, _ = label(~mapped)
    cells = [cell_of((pose.x, pose.y)) for pose in [start, *(place.pose for place in site.places)]]
    rows, columns = mapped.shape
    inside = sorted({int(parts[row, column]) for row, column in cells if 0 <= row < rows and 0 <= column < columns})
    return np.isin(parts, [part for part in inside if part > 0])


def _disc(radius: float) -> NDArray[np.float32]:
    """Distances of a square patch of cells from its middle; infinite beyond the radius."""
    reach = math.ceil(radius / CELL_M)
    offsets = np.arange(-reach, reach + 1) * CELL_M
    distances = np.hypot(offsets[:, None], offsets[None, :])
    return np.where(distances <= radius, distances, np.inf).astype(np.float32)
