"""The floor drawn with characters: what stands still once a size, what moves once a view.

A cell of a terminal is about twice as tall as wide, so the dot patterns of two by four dots a cell make square dots:
walls are drawn in them at the finest, and the aspect is right. Without dot patterns, a cell's dots are turned into the
ASCII mark that looks most like them. What moves is a layer of few cells over the still one, so that showing the next
view costs no more than what changed.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from runner.host.view import View
from runner.screen.ink import Glyphs, Ink
from runner.screen.labels import place_labels
from runner.site.floor import Floor, footprint_at, rasterize
from runner.site.values import CELL_M, Point, Pose, RobotDescription, Site

Spot = tuple[int, int]
"""Row and column of a character cell."""

Drawn = tuple[str, Ink]
"""What a cell shows."""

_DOT_BITS = np.array([[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]], dtype=np.uint8)
"""Unicode's numbering of the dots of a pattern, by row and column (Unicode Standard, block 2800)."""

_FOOTPRINT_FROM = 5.0
"""Dots a footprint must be long before its outline is drawn; smaller ones hide behind the arrow."""


@dataclass(frozen=True, slots=True)
class Scale:
    """Where a point of the site falls among the dots. `left` and `top` are the margins, in dots."""

    columns: int
    rows: int
    dots_per_meter: float
    left: float
    top: float
    height: float
    """Of the site, meters: y points up there and down here."""

    def dot(self, point: Point) -> tuple[int, int]:
        """Row and column of the dot a point falls on; it may lie outside."""
        x, y = point
        return (
            math.floor(self.top + (self.height - y) * self.dots_per_meter),
            math.floor(self.left + x * self.dots_per_meter),
        )

    def spot(self, point: Point) -> Spot | None:
        """The cell a point falls in, None outside."""
        row, column = self.dot(point)
        row, column = row // 4, column // 2
        return (row, column) if 0 <= row < self.rows and 0 <= column < self.columns else None


def fit(site: Site, columns: int, rows: int) -> Scale:
    """The scale at which the whole floor just fits, centered. Both of its outer edges fall on a dot."""
    dots = max(min((columns * 2 - 1) / site.width, (rows * 4 - 1) / site.height), 0.0)
    left = (columns * 2 - site.width * dots) / 2
    top = (rows * 4 - site.height * dots) / 2
    return Scale(columns, rows, dots, left, top, site.height)


class FloorDrawing:
    """One site and robot, drawn at one size after another."""

    def __init__(self, site: Site, robot: RobotDescription, glyphs: Glyphs) -> None:
        self._site = site
        self._robot = robot
        self._glyphs = glyphs
        self._floor = rasterize(site)
        self.still: list[list[Drawn]] = []
        self._scale = fit(site, 0, 0)
        self._walls = np.zeros((0, 0), dtype=np.uint8)
        self._bare: list[list[Drawn]] = []
        self._goal: str | None = None

    def resize(self, columns: int, rows: int) -> None:
        """Draw what stands still anew, for a panel of that many cells."""
        self._scale = fit(self._site, columns, rows)
        self._walls = _pack(wall_dots(self._site, self._floor, self._scale))
        self._bare = [
            [(self._pattern(int(bits)), Ink.WALL) if bits else (" ", Ink.TEXT) for bits in row] for row in self._walls
        ]
        self._draw_doors()
        self._draw_places()

    def aim(self, goal: str | None) -> None:
        """Mark the place the robot is on its way to; it is the first to be named in full."""
        if goal != self._goal:
            self._goal = goal
            self._draw_places()

    def moving(self, view: View | None) -> dict[Spot, Drawn]:
        """The cells that differ from the still layer, for a view: route, sensed points, robot, in this order."""
        if view is None or not self.still:
            return {}
        cells: dict[Spot, Drawn] = {}
        self._dots(cells, _dashes(view.route, self._scale), Ink.ROUTE)
        for spot in filter(None, map(self._scale.spot, view.obstacles)):
            cells[spot] = (self._glyphs.sensed, Ink.SENSED)
        if view.pose is not None:
            self._draw_robot(cells, view.pose)
        return cells

    def _pattern(self, bits: int) -> str:
        return chr(0x2800 + bits) if self._glyphs.dots else _ASCII_PATTERNS[bits]

    def _dots(self, cells: dict[Spot, Drawn], dots: Iterable[tuple[int, int]], ink: Ink) -> None:
        """Add dots to the cells, over what walls they have."""
        added: dict[Spot, int] = {}
        for row, column in dots:
            spot = (row // 4, column // 2)
            if 0 <= spot[0] < self._scale.rows and 0 <= spot[1] < self._scale.columns:
                added[spot] = added.get(spot, 0) | int(_DOT_BITS[row % 4, column % 2])
        for spot, bits in added.items():
            if self.still[spot[0]][spot[1]][1] not in (Ink.PLACE, Ink.GOAL):
                over_walls = self._pattern(bits | int(self._walls[spot]))
                cells[spot] = (over_walls if self._glyphs.dots else self._glyphs.route, ink)

    def _draw_doors(self) -> None:
        """One mark a cell along each door's leaf."""
        for door in self._site.doors:
            (x1, y1), (x2, y2) = door.start, door.end
            across = abs(x2 - x1) >= abs(y2 - y1)
            mark = self._glyphs.door_across if across else self._glyphs.door_upright
            for row, column in _stroke(((door.start), (door.end)), self._scale, inset=0.2):
                spot = (row // 4, column // 2)
                if 0 <= spot[0] < self._scale.rows and 0 <= spot[1] < self._scale.columns:
                    self._bare[spot[0]][spot[1]] = (mark, Ink.DOOR)

    def _draw_places(self) -> None:
        """Names and marks of the places over walls and doors, those of the goal first."""
        places = sorted(self._site.places, key=lambda place: place.name != self._goal)
        spots = {place.name: self._scale.spot((place.pose.x, place.pose.y)) for place in places}
        seen = {name: spot for name, spot in spots.items() if spot is not None}
        labels = place_labels(seen, self._walls, self._glyphs)
        self.still = [list(row) for row in self._bare]
        for name, (row, column) in seen.items():
            goal = name == self._goal
            ink = Ink.GOAL if goal else Ink.PLACE
            self.still[row][column] = (self._glyphs.goal if goal else self._glyphs.place, ink)
            label = labels.get(name)
            if label is not None:
                cells = [(char, ink) for char in label.text]
                self.still[label.row][label.column : label.column + len(cells)] = cells

    def _draw_robot(self, cells: dict[Spot, Drawn], pose: Pose) -> None:
        corners = footprint_at(self._robot.footprint, pose)
        length = max(math.dist(a, b) for a in corners for b in corners) * self._scale.dots_per_meter
        if length >= _FOOTPRINT_FROM:
            self._dots(cells, _stroke((*corners, corners[0]), self._scale), Ink.ROBOT)
        spot = self._scale.spot((pose.x, pose.y))
        if spot is not None:
            sectors = self._glyphs.heading
            turn = round(pose.heading / math.tau * len(sectors)) % len(sectors)
            cells[spot] = (sectors[turn], Ink.ROBOT)


def wall_dots(site: Site, floor: Floor, scale: Scale) -> NDArray[np.bool_]:
    """True for each dot that is solid.

    A dot that is at least half covered is; and so is each one that the middle line of a wall, or the edge of a solid,
    runs through, so that a wall thinner than a dot is still one unbroken line, but for its doors.
    """
    dots = _covered(floor, scale) >= 0.5
    lines = [wall.points for wall in site.walls] + [(*block.corners, block.corners[0]) for block in site.solids]
    for points in lines:
        for point in _along(points, 0.5 / scale.dots_per_meter if scale.dots_per_meter > 0 else 1.0):
            row, column = scale.dot(point)
            if 0 <= row < dots.shape[0] and 0 <= column < dots.shape[1] and _solid_near(floor, point):
                dots[row, column] = True
    for door in site.doors:
        for row, column in _stroke((door.start, door.end), scale, inset=0.3):
            if 0 <= row < dots.shape[0] and 0 <= column < dots.shape[1]:
                dots[row, column] = False
    return dots


def _covered(floor: Floor, scale: Scale) -> NDArray[np.float32]:
    """The share of each dot that is solid, by sampling every raster cell, or every dot where dots are smaller."""
    rows, columns = floor.shape
    steps = max(1, math.ceil(scale.dots_per_meter * CELL_M))  # samples a raster cell side
    xs = (np.arange(columns * steps) + 0.5) * (CELL_M / steps)
    ys = (np.arange(rows * steps) + 0.5) * (CELL_M / steps)
    down = _shares(scale.top + (scale.height - ys) * scale.dots_per_meter, scale.rows * 4)
    across = _shares(scale.left + xs * scale.dots_per_meter, scale.columns * 2)
    solid = floor.solid.repeat(steps, axis=0).repeat(steps, axis=1).astype(np.float32)
    return np.asarray(down @ solid @ across.T, dtype=np.float32)


def _shares(positions: NDArray[np.floating], count: int) -> NDArray[np.float32]:
    """Row i holds the weights with which the samples make up the mean of dot i."""
    index = np.floor(positions).astype(np.intp)
    inside = (index >= 0) & (index < count)
    weights = np.zeros((count, len(positions)), dtype=np.float32)
    weights[index[inside], np.nonzero(inside)[0]] = 1.0
    return np.asarray(weights / np.maximum(weights.sum(axis=1, keepdims=True), 1.0), dtype=np.float32)


def _solid_near(floor: Floor, point: Point) -> bool:
    """Whether the raster is solid at a point or right beside it: a line along an edge counts, a doorway does not."""
    row, column = math.floor(point[1] / CELL_M), math.floor(point[0] / CELL_M)
    around = floor.solid[max(row - 1, 0) : row + 2, max(column - 1, 0) : column + 2]
    return bool(around.any())


def _along(points: Sequence[Point], step: float) -> Iterable[Point]:
    """Points no farther apart than `step` along a polyline, its ends included."""
    for (x1, y1), (x2, y2) in pairwise(points):
        count = max(math.ceil(math.hypot(x2 - x1, y2 - y1) / step), 1)
        for number in range(count + 1):
            share = number / count
            yield x1 + (x2 - x1) * share, y1 + (y2 - y1) * share


def _stroke(points: Sequence[Point], scale: Scale, inset: float = 0.0) -> Iterable[tuple[int, int]]:
    """The dots along a polyline; `inset` leaves that share of a single segment's length away at either end."""
    if inset:
        (x1, y1), (x2, y2) = points[0], points[-1]
        dx, dy = (x2 - x1) * inset, (y2 - y1) * inset
        points = ((x1 + dx, y1 + dy), (x2 - dx, y2 - dy))
    return (scale.dot(point) for point in _along(points, 0.5 / scale.dots_per_meter))


def _dashes(route: Sequence[Point], scale: Scale) -> Iterable[tuple[int, int]]:
    """Every other pair of dots along a route: walls are unbroken, routes are not."""
    seen: dict[tuple[int, int], None] = dict.fromkeys(_stroke(route, scale) if len(route) > 1 else ())
    return [dot for number, dot in enumerate(seen) if number % 3 != 2]


def _pack(dots: NDArray[np.bool_]) -> NDArray[np.uint8]:
    """Dots (4 rows, 2 columns a cell) as one pattern number a cell."""
    rows, columns = dots.shape[0] // 4, dots.shape[1] // 2
    cells = dots.reshape(rows, 4, columns, 2)
    packed = (cells * _DOT_BITS[None, :, None, :]).sum(axis=(1, 3))
    return np.asarray(packed, dtype=np.uint8)


def _ascii_pattern(bits: int) -> str:
    """The ASCII mark that looks most like a dot pattern."""
    dots: NDArray[np.bool_] = np.not_equal(_DOT_BITS & np.uint8(bits), 0)
    rows, columns, count = dots.sum(axis=1), dots.sum(axis=0), int(dots.sum())
    if count == 0 or count >= 6:
        return "#" if count else " "
    if np.count_nonzero(rows) >= 3:
        return "+" if rows.max() == 2 else "|"
    if columns.min() > 0:
        return "_" if rows[3] and not rows[:3].sum() else "-"
    return "'" if rows[:2].sum() else "."


_ASCII_PATTERNS = tuple(_ascii_pattern(bits) for bits in range(256))
