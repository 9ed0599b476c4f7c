"""Where a robot can get with its whole footprint, turning included: a flood over cells and headings.

The robot stands in the middle of a cell with one of 32 headings. It drives to a next cell that lies about ahead or
behind, or turns on the spot to a next heading, where all that the footprint covers meanwhile is free. So a way that
the flood finds can be driven; one that needs finer steps than 5 cm and 11 degrees may be missed. Cells with room for a
full turn count once, whatever the heading, so the work is in the tight places.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from runner.site.floor import Cell, cell_of, circumscribed_radius, footprint_at, inscribed_radius
from runner.site.sweep import HALF_DIAGONAL_M, cells_under, hull
from runner.site.values import CELL_M, Point, Pose

HEADINGS = 32
STEP = 2.0 * math.pi / HEADINGS
DIRECTIONS = ((0, 1), (1, 1), (1, 0), (1, -1), (0, -1), (-1, -1), (-1, 0), (-1, 1))
"""The eight neighbors of a cell as row and column, counterclockwise from +x."""
NO_DIRECTION = -1
NEAR_CELLS = 2
"""A robot on its way along a route counts as having come to a point of it this near by."""


@dataclass(frozen=True, slots=True)
class Reach:
    """Everywhere a robot can get to.

    Bit h of `headings` at a cell says that it can come to stand there facing heading number h.
    """

    headings: NDArray[np.uint32]

    def holds(self, pose: Pose) -> bool:
        """Whether a pose, to the nearest cells and headings, can be come to."""
        bits = _near_bits(pose.heading)
        return any(int(self.headings[cell]) & bits for cell in _near_cells(pose, self.headings.shape))

    def near(self, point: Point) -> bool:
        """Whether the robot can stand within NEAR_CELLS of a point, facing anywhere."""
        row, column = cell_of(point)
        rows = slice(max(row - NEAR_CELLS, 0), max(row + NEAR_CELLS + 1, 0))
        columns = slice(max(column - NEAR_CELLS, 0), max(column + NEAR_CELLS + 1, 0))
        return bool(self.headings[rows, columns].any())


def roomy(clearance: NDArray[np.float32], footprint: Sequence[Point]) -> NDArray[np.bool_]:
    """Cells in whose middle the robot can turn all the way round."""
    return np.asarray(clearance >= circumscribed_radius(footprint) + HALF_DIAGONAL_M)


def reach(blocked: NDArray[np.bool_], clearance: NDArray[np.float32], footprint: Sequence[Point], start: Pose) -> Reach:
    """Everywhere the robot can get to from a pose, to the nearest cells and headings."""
    from runner.site.lattice_kernels import flood

    outline = hull(footprint)
    open_ = roomy(clearance, outline)
    possible = clearance >= inscribed_radius(outline) if inscribed_radius(outline) > 0.0 else ~blocked
    counts = np.zeros((blocked.shape[0], blocked.shape[1] + 1), dtype=np.int32)
    counts[:, 1:] = np.cumsum(blocked, axis=1, dtype=np.int32)
    stretches, begins = _masks(outline)
    seeds = [
        (row, column, heading)
        for row, column in _near_cells(start, (blocked.shape[0], blocked.shape[1]))
        for heading in range(HEADINGS)
        if _near_bits(start.heading) >> heading & 1
    ]
    headings = flood(
        counts, open_, np.asarray(possible), stretches, begins, _drive_directions(), np.array(seeds, dtype=np.int64)
    )
    return Reach(headings)


def _near_cells(pose: Pose, shape: tuple[int, int]) -> list[Cell]:
    """The cells whose middles are within a cell's side of a pose."""
    row, column = cell_of((pose.x, pose.y))
    found = []
    for r in range(row - 1, row + 2):
        for c in range(column - 1, column + 2):
            away = max(abs((c + 0.5) * CELL_M - pose.x), abs((r + 0.5) * CELL_M - pose.y))
            if 0 <= r < shape[0] and 0 <= c < shape[1] and away < CELL_M * 0.75:
                found.append((r, c))
    return found


def _near_bits(heading: float) -> int:
    """The headings next to an angle: the one it is, or the two it lies between."""
    low = math.floor(heading / STEP + 1e-6)
    high = math.ceil(heading / STEP - 1e-6)
    return 1 << low % HEADINGS | 1 << high % HEADINGS


def _drive_directions() -> NDArray[np.int64]:
    """For each heading the one or two neighbors that lie ahead, shape (HEADINGS, 2)."""
    ahead = np.full((HEADINGS, 2), NO_DIRECTION, dtype=np.int64)
    for heading in range(HEADINGS):
        low, rest = divmod(heading, HEADINGS // 8)
        ahead[heading, 0] = low
        if rest:
            ahead[heading, 1] = (low + 1) % 8
    return ahead


def _masks(outline: Sequence[Point]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """What each motion covers, as stretches (row, first column, column after the last) relative to where it begins.

    Motion 4 h + 0 stands with heading h, + 1 and + 2 drive to its neighbors ahead, + 3 turns to heading h + 1; the
    stretches of motion m are `begins[m]` to `begins[m + 1]`.
    """
    ahead = _drive_directions()
    stretches: list[tuple[int, int, int]] = []
    begins = [0]
    for heading in range(HEADINGS):
        for shape in _motions(outline, heading, ahead[heading]):
            stretches += _stretches(shape)
            begins.append(len(stretches))
    return np.array(stretches, dtype=np.int64), np.array(begins, dtype=np.int64)


def _motions(outline: Sequence[Point], heading: int, ahead: NDArray[np.int64]) -> list[tuple[Point, ...]]:
    middle = 0.5 * CELL_M
    here = footprint_at(outline, Pose(middle, middle, heading * STEP))
    shapes = [hull(here)]
    for direction in ahead:
        row, column = DIRECTIONS[direction] if direction != NO_DIRECTION else (0, 0)
        there = tuple((x + column * CELL_M, y + row * CELL_M) for x, y in here)
        shapes.append(hull((*here, *there)))
    following = footprint_at(outline, Pose(middle, middle, (heading + 1) * STEP))
    shapes.append(hull((*here, *following, *_bulges(outline, heading, middle))))
    return shapes


def _bulges(outline: Sequence[Point], heading: int, middle: float) -> tuple[Point, ...]:
    """Where the tangents at both ends of each corner's arc meet, so that the hull holds the arc."""
    wider = 1.0 / math.cos(0.5 * STEP)
    scaled = [(x * wider, y * wider) for x, y in outline]
    return footprint_at(scaled, Pose(middle, middle, (heading + 0.5) * STEP))


def _stretches(shape: Sequence[Point]) -> list[tuple[int, int, int]]:
    cells = cells_under(shape)
    found = []
    for row in np.unique(cells[:, 0]):
        columns = cells[cells[:, 0] == row, 1]
        found.append((int(row), int(columns.min()), int(columns.max()) + 1))
    return found
