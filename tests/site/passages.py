"""Random doorways and corners, and what a footprint can do in them by brute force: polygons against cells."""

from __future__ import annotations

import math
from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from random import Random

import numpy as np
import shapely
from numpy.typing import NDArray

from runner.site.floor import cell_of, clearance, footprint_at, rasterize
from runner.site.lattice import DIRECTIONS, HEADINGS, STEP
from runner.site.values import CELL_M, Point, Pose, Site, Wall

TOUCH = 1e-9
"""Overlaps smaller than this, square meters, are touches."""
SHRUNK = 1e-6
"""Meters taken off all around a shape, so that it overlaps nothing that it only touches."""


@dataclass(frozen=True, slots=True)
class Passage:
    """Two rooms with something narrow between them, and where the robot begins and ends."""

    kind: str
    site: Site
    footprint: tuple[Point, ...]
    start: Pose
    goal: Pose

    @property
    def blocked(self) -> NDArray[np.bool_]:
        return rasterize(self.site).blocked()

    @property
    def clearance(self) -> NDArray[np.float32]:
        return clearance(self.blocked)


def random_passage(random: Random) -> Passage:
    """A doorway in a wall, straight or at the end of a passage along a wall, or a passage with a corner."""
    length, width = random.uniform(0.3, 0.8), random.uniform(0.25, 0.6)
    ahead = random.uniform(0.3, 0.7) * length
    footprint = ((ahead, width / 2), (ahead - length, width / 2), (ahead - length, -width / 2), (ahead, -width / 2))
    gap = width * random.uniform(0.9, 1.2) + random.uniform(0.0, 0.7)
    return _doorway(random, footprint, gap) if random.random() < 0.5 else _corner(random, footprint, gap)


def _doorway(random: Random, footprint: tuple[Point, ...], gap: float) -> Passage:
    """Two rooms of 2 m; the wall between them is at times thick, at times slanting, and something may stand behind."""
    low = random.uniform(0.2, 1.8 - min(gap, 1.4))
    lean = random.uniform(-0.4, 0.4)
    thick = random.choice((0.1, 0.2, 0.6))
    x = 2.0
    walls = [
        Wall(((x, -0.1), (x + lean * 0.3, low)), thick),
        Wall(((x + lean * 0.3, low + gap), (x, 2.1)), thick),
    ]
    if random.random() < 0.5:
        walls.append(Wall(((x + random.uniform(0.5, 1.0), 0.0), (x + 0.8, random.uniform(0.2, 1.6))), 0.1))
    return _passage("doorway", (4.0, 2.0), walls, footprint, (1.0, 1.0), (3.3, 1.8 - random.uniform(0.4, 0.8)), random)


def _corner(random: Random, footprint: tuple[Point, ...], gap: float) -> Passage:
    """A passage along the bottom that turns up at its end: its outer walls are the floor's edge."""
    up = max(0.3, gap * random.uniform(0.8, 1.3))
    block = Wall(((-0.1, gap + 0.65), (3.0 - up, gap + 0.65)), 1.3)
    return _passage("corner", (3.0, 3.0), [block], footprint, (0.9, gap / 2), (3.0 - up / 2, 2.2), random)


def _passage(
    kind: str,
    size: tuple[float, float],
    walls: Sequence[Wall],
    footprint: tuple[Point, ...],
    start: Point,
    goal: Point,
    random: Random,
) -> Passage:
    width, height = size
    outline = Wall(((0.0, 0.0), (width, 0.0), (width, height), (0.0, height), (0.0, 0.0)), 0.1)
    site = Site(kind, width, height, (outline, *walls), (), (), ())
    facing = random.choice((0.0, 0.5, 1.0)) * math.pi if kind == "doorway" else 0.0
    return Passage(kind, site, footprint, Pose(*_centered(start), 0.0), Pose(*_centered(goal), facing))


def _centered(point: Point) -> Point:
    """The middle of the cell a point is in: what the lattice and brute force both stand on."""
    return tuple((math.floor(value / CELL_M) + 0.5) * CELL_M for value in point)  # type: ignore[return-value]


# --- brute force --------------------------------------------------------------------------------------------------


def solid_cells(blocked: NDArray[np.bool_]) -> shapely.Geometry:
    """Every blocked cell as its square, and a rim of a meter around the floor, in one geometry."""
    rows, columns = blocked.shape
    at = np.argwhere(blocked)
    boxes = shapely.box(at[:, 1] * CELL_M, at[:, 0] * CELL_M, (at[:, 1] + 1) * CELL_M, (at[:, 0] + 1) * CELL_M)
    floor = shapely.box(0.0, 0.0, columns * CELL_M, rows * CELL_M)
    rim = shapely.box(-1.0, -1.0, columns * CELL_M + 1.0, rows * CELL_M + 1.0).difference(floor)
    return shapely.union_all([*boxes, rim])


def overlaps(solid: shapely.Geometry, shapes: NDArray[np.object_]) -> NDArray[np.bool_]:
    """Which shapes overlap what is solid by more than a touch."""
    found = np.asarray(shapely.intersects(solid, shapes))
    maybe = np.flatnonzero(found)
    areas = shapely.area(shapely.intersection(solid, shapes[maybe]))
    found[maybe[areas <= TOUCH]] = False
    return found


def between(footprint: Sequence[Point], start: Pose, end: Pose) -> shapely.Geometry:
    return shapely.MultiPoint([*footprint_at(footprint, start), *footprint_at(footprint, end)]).convex_hull


def swept_by_force(solid: shapely.Geometry, footprint: Sequence[Point], poses: Sequence[Pose]) -> int | None:
    """The number of the first motion of a drive that hits something."""
    shapes = np.array([between(footprint, one, two) for one, two in pairwise(poses)])
    hits = np.flatnonzero(overlaps(solid, shapes))
    return int(hits[0]) if len(hits) else None


def reached_by_force(passage: Passage) -> set[tuple[int, int, int]]:
    """Every (row, column, heading) that can be come to, by breadth first search over polygons: no masks, no shortcuts.

    A turn is swept by the hull of nine poses; a drive by the hull of both.
    """
    rows, columns = passage.blocked.shape
    solid = solid_cells(passage.blocked)
    shapely.prepare(solid)
    row_middles, column_middles = np.divmod(np.arange(rows * columns), columns)
    middles = (np.stack([column_middles, row_middles], axis=1) + 0.5) * CELL_M
    free: dict[tuple[int, int], NDArray[np.bool_]] = {}
    for heading in range(HEADINGS):
        for number, shape in enumerate(_motion_shapes(passage.footprint, heading)):
            corners = shapely.get_coordinates(shape.buffer(-SHRUNK, join_style="mitre"))
            moved = shapely.polygons(corners[None, :, :] + middles[:, None, :])
            free[heading, number] = ~shapely.intersects(solid, moved).reshape(rows, columns)
    return _flooded(free, passage)


def _motion_shapes(footprint: Sequence[Point], heading: int) -> list[shapely.Geometry]:
    here = Pose(0.0, 0.0, heading * STEP)
    shapes = [shapely.Polygon(footprint_at(footprint, here))]
    for direction in ahead_of(heading):
        row, column = DIRECTIONS[direction]
        shapes.append(between(footprint, here, replace(here, x=column * CELL_M, y=row * CELL_M)))
    turned = [footprint_at(footprint, Pose(0.0, 0.0, (heading + part / 8) * STEP)) for part in range(9)]
    return [*shapes, shapely.MultiPoint([point for corners in turned for point in corners]).convex_hull]


def ahead_of(heading: int) -> list[int]:
    """The neighbors less than 45 degrees off a heading."""
    angle = heading * STEP
    return [
        direction
        for direction in range(8)
        if abs(math.remainder(direction * math.pi / 4 - angle, 2 * math.pi)) < math.pi / 4 - 1e-9
    ]


def _flooded(free: dict[tuple[int, int], NDArray[np.bool_]], passage: Passage) -> set[tuple[int, int, int]]:
    row, column = cell_of((passage.start.x, passage.start.y))
    start = (row, column, round(passage.start.heading / STEP) % HEADINGS)
    if not free[start[2], 0][start[0], start[1]]:
        return set()
    seen, waiting = {start}, deque([start])
    while waiting:
        for onward in _moves(free, *waiting.popleft()):
            if onward not in seen:
                seen.add(onward)
                waiting.append(onward)
    return seen


def _moves(
    free: dict[tuple[int, int], NDArray[np.bool_]], row: int, column: int, heading: int
) -> list[tuple[int, int, int]]:
    found = []
    turn = len(ahead_of(heading)) + 1
    if free[heading, turn][row, column]:
        found.append((row, column, (heading + 1) % HEADINGS))
    before = (heading - 1) % HEADINGS
    if free[before, len(ahead_of(before)) + 1][row, column]:
        found.append((row, column, before))
    rows, columns = free[heading, 0].shape
    for number, direction in enumerate(ahead_of(heading), start=1):
        row_step, column_step = DIRECTIONS[direction]
        if free[heading, number][row, column]:
            found.append((row + row_step, column + column_step, heading))
        back = (row - row_step, column - column_step)
        if 0 <= back[0] < rows and 0 <= back[1] < columns and free[heading, number][back]:
            found.append((*back, heading))
    return found
