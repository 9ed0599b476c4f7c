"""What a whole footprint covers while it stands, drives and turns, on the 5 cm grid: the check a disc cannot make.

Conservative: a cell counts as covered where any part of its square lies under the footprint, between two poses the
convex hull of both counts, and a hollow footprint counts as filled. What this finds free is free.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from runner.site.floor import cell_of, center_of, circumscribed_radius, footprint_at
from runner.site.values import CELL_M, Point, Pose

TURN_STEP = math.radians(5.0)
"""A turn is swept in steps of at most this."""
SMOOTH_POINTS = 3
"""A route is averaged over so many of its points to each side before headings are taken from it: robots do not drive
the corners of a grid."""
HEADING_REACH = 2
"""The heading at a point of a route is that from so many points before it to so many after it."""
HALF_DIAGONAL_M = CELL_M * math.sqrt(0.5)


@dataclass(frozen=True, slots=True)
class Hit:
    """Where a sweep first covers something: the pose it was coming from, and the middle of a cell that is hit."""

    pose: Pose
    obstacle: Point


def hull(points: Sequence[Point]) -> tuple[Point, ...]:
    """The convex hull, counterclockwise (Andrew's monotone chain, 1979)."""
    ordered = sorted(set(points))
    if len(ordered) < 3:
        return tuple(ordered)
    lower, upper = _half_hull(ordered), _half_hull(ordered[::-1])
    return tuple(lower[:-1] + upper[:-1])


def _half_hull(ordered: Sequence[Point]) -> list[Point]:
    chain: list[Point] = []
    for point in ordered:
        while len(chain) >= 2 and _turn(chain[-2], chain[-1], point) <= 0.0:
            chain.pop()
        chain.append(point)
    return chain


def _turn(one: Point, two: Point, three: Point) -> float:
    return (two[0] - one[0]) * (three[1] - one[1]) - (two[1] - one[1]) * (three[0] - one[0])


def cells_under(corners: Sequence[Point]) -> NDArray[np.intp]:
    """Cells, (n, 2) as row and column, whose squares a convex counterclockwise polygon overlaps, not just touches.

    The cells may lie off the floor. By the separating axis theorem, so exact.
    """
    xs, ys = [x for x, _ in corners], [y for _, y in corners]
    rows = np.arange(math.floor(min(ys) / CELL_M) - 1, math.floor(max(ys) / CELL_M) + 2)
    columns = np.arange(math.floor(min(xs) / CELL_M) - 1, math.floor(max(xs) / CELL_M) + 2)
    x, y = (columns[None, :] + 0.5) * CELL_M, (rows[:, None] + 0.5) * CELL_M
    reach = 0.5 * CELL_M - 1e-9
    inside = (x > min(xs) - reach) & (x < max(xs) + reach) & (y > min(ys) - reach) & (y < max(ys) + reach)
    for (x1, y1), (x2, y2) in pairwise([*corners, corners[0]]):
        normal_x, normal_y = y2 - y1, x1 - x2
        inside &= normal_x * (x - x1) + normal_y * (y - y1) < reach * (abs(normal_x) + abs(normal_y))
    return np.argwhere(inside) + np.array([rows[0], columns[0]], dtype=np.intp)


def covered(footprint: Sequence[Point], start: Pose, end: Pose) -> NDArray[np.intp]:
    """Cells that the footprint covers from one pose to one near to it."""
    return cells_under(hull((*footprint_at(footprint, start), *footprint_at(footprint, end))))


def first_blocked(blocked: NDArray[np.bool_], cells: NDArray[np.intp]) -> Point | None:
    """The middle of a cell that is blocked or off the floor; None where all are free."""
    rows, columns = blocked.shape
    off = (cells < 0).any(axis=1) | (cells[:, 0] >= rows) | (cells[:, 1] >= columns)
    hit = off | blocked[np.clip(cells[:, 0], 0, rows - 1), np.clip(cells[:, 1], 0, columns - 1)]
    index = int(hit.argmax())
    return center_of((int(cells[index, 0]), int(cells[index, 1]))) if hit[index] else None


def sweep(
    blocked: NDArray[np.bool_], clearance: NDArray[np.float32], footprint: Sequence[Point], poses: Sequence[Pose]
) -> Hit | None:
    """Drive the footprint from pose to pose; where it first hits something, or None.

    Stretches on which nothing is within reach of the footprint in any direction are not looked at.
    """
    reach = circumscribed_radius(footprint) + HALF_DIAGONAL_M + CELL_M
    for start, end in pairwise(poses):
        if _clearance_at(clearance, start) > reach and _clearance_at(clearance, end) > reach:
            continue
        obstacle = first_blocked(blocked, covered(footprint, start, end))
        if obstacle is not None:
            return Hit(start, obstacle)
    return None


def _clearance_at(clearance: NDArray[np.float32], pose: Pose) -> float:
    row, column = cell_of((pose.x, pose.y))
    inside = 0 <= row < clearance.shape[0] and 0 <= column < clearance.shape[1]
    return float(clearance[row, column]) if inside else 0.0


def poses_along(points: NDArray[np.float64]) -> list[Pose]:
    """A route, (n, 2) points in meters, as poses: smoothed, and facing the way it leads. Both ends stay in place."""
    if len(points) < 2:
        return []
    smooth = points.astype(np.float64).copy()
    for index in range(1, len(points) - 1):
        width = min(SMOOTH_POINTS, index, len(points) - 1 - index)
        smooth[index] = points[index - width : index + width + 1].mean(axis=0)
    last = len(smooth) - 1
    poses: list[Pose] = []
    for index in range(len(smooth)):
        before, after = smooth[max(index - HEADING_REACH, 0)], smooth[min(index + HEADING_REACH, last)]
        heading = math.atan2(after[1] - before[1], after[0] - before[0])
        here = Pose(float(smooth[index, 0]), float(smooth[index, 1]), heading)
        if poses:
            poses += turning(poses[-1], here)
        poses.append(here)
    return poses


def turning(start: Pose, end: Pose, *, other_way: bool = False) -> list[Pose]:
    """Poses between two, ends left out, none turned by more than TURN_STEP; the short way round or the other."""
    by = math.remainder(end.heading - start.heading, 2.0 * math.pi)
    if other_way:
        by -= math.copysign(2.0 * math.pi, by)
    steps = math.ceil(abs(by) / TURN_STEP)
    return [
        Pose(
            start.x + (end.x - start.x) * step / steps,
            start.y + (end.y - start.y) * step / steps,
            start.heading + by * step / steps,
        )
        for step in range(1, steps)
    ]


def turn_hit(
    blocked: NDArray[np.bool_],
    clearance: NDArray[np.float32],
    footprint: Sequence[Point],
    at: Pose,
    heading: float,
) -> Hit | None:
    """What is in the way of turning on the spot to a heading, both ways round; None where one way is free."""
    end = Pose(at.x, at.y, heading)
    hits = [
        sweep(blocked, clearance, footprint, [at, *turning(at, end, other_way=other_way), end])
        for other_way in (False, True)
    ]
    return None if None in hits else hits[0]
