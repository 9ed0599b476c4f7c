"""The floor drawn with characters: what stands still once a size, what moves once a view.

A cell of a terminal is about twice as tall as wide, so the dot patterns of two by four dots a cell make square dots:
walls are drawn in them at the finest, and the aspect is right. Without dot patterns, a cell's dots are turned into the
ASCII mark that looks most like them. What moves is a layer of few cells over the still one, so that showing the next
view costs no more than what changed.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from runner.host.view import View
from runner.screen.floor_dots import Scale, fit, furniture_dots, standing, stroke, wall_dots
from runner.screen.ink import Glyphs, Ink
from runner.screen.labels import place_labels
from runner.screen.recollection import Recollection
from runner.screen.sight import Sight, scale_of
from runner.site.floor import doors_shut_at, footprint_at
from runner.site.values import Point, Pose, RobotDescription, Site

Spot = tuple[int, int]
"""Row and column of a character cell."""

Drawn = tuple[str, Ink]
"""What a cell shows."""

_DOT_BITS = np.array([[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]], dtype=np.uint8)
"""Unicode's numbering of the dots of a pattern, by row and column (Unicode Standard, block 2800)."""

_FOOTPRINT_FROM = 5.0
"""Dots a footprint must be long before its outline is drawn; smaller ones hide behind the arrow."""

_SPREADS = 2.0
"""Standard deviations at which the ring around the robot is drawn: about seven times in eight it is inside."""
_RING_FROM = 6.0
"""Dots a ring's radius must have; smaller ones hide behind the robot."""

_NAMED = (Ink.PLACE, Ink.GOAL)
_NOTHING = Recollection()


class FloorDrawing:
    """One site and robot, drawn at one size after another."""

    def __init__(self, site: Site, robot: RobotDescription, glyphs: Glyphs) -> None:
        self._site = site
        self._robot = robot
        self._glyphs = glyphs
        self._standing = standing(site)
        self.still: list[list[Drawn]] = []
        self._scale = fit(site, 0, 0)
        self._walls = np.zeros((0, 0), dtype=np.uint8)
        self._bare: list[list[Drawn]] = []
        self._goal: str | None = None
        self._shut: tuple[str, ...] = ()

    @property
    def scale(self) -> Scale:
        """Where points fall now."""
        return self._scale

    def resize(self, columns: int, rows: int, sight: Sight = Sight()) -> None:  # noqa: B008 - a frozen value
        """Draw what stands still anew, for a panel of that many cells."""
        self._scale = scale_of(sight, self._site, columns, rows)
        walls = wall_dots(self._standing, self._scale)
        only_walls = _pack(walls)
        self._walls = _pack(walls | furniture_dots(self._standing, self._scale))
        self._bare = [
            [self._at_rest(int(wall), int(both)) for wall, both in zip(*rows, strict=True)]
            for rows in zip(only_walls, self._walls, strict=True)
        ]
        self._draw_doors()
        self._draw_places()

    def aim(self, goal: str | None) -> None:
        """Mark the place the robot is on its way to; it is the first to be named in full."""
        if goal != self._goal:
            self._goal = goal
            self._draw_places()

    @property
    def shut(self) -> tuple[str, ...]:
        """The doors that are drawn shut."""
        return self._shut

    def tell_time(self, clock: float) -> None:
        """Draw the doors as their known hours have them at this time of day, in seconds. Nobody tells us of the doors
        themselves."""
        shut = doors_shut_at(self._site, clock)
        if shut != self._shut:
            self._shut = shut
            self._draw_doors()
            self._draw_places()

    def moving(self, view: View | None, kept: Recollection = _NOTHING, old: bool = False) -> dict[Spot, Drawn]:
        """The cells that differ from the still layer, for a view; what matters most is drawn last.

        `old` news are drawn faint, and a robot of which there is no news as a question mark.
        """
        if view is None or not self.still:
            return {}
        cells: dict[Spot, Drawn] = {}
        self._dots(cells, map(self._scale.dot, kept.trail), Ink.TRAIL, self._glyphs.trail)
        self._mark(cells, kept.before(), self._glyphs.before, Ink.BEFORE)
        if view.pose is not None and view.spread is not None:
            self._draw_spread(cells, view.pose, view.spread * _SPREADS)
        self._dots(cells, _dashes(view.route, self._scale), Ink.ROUTE, self._glyphs.route)
        self._mark(cells, view.obstacles, self._glyphs.sensed, Ink.SENSED)
        self._mark(cells, kept.troubles, self._glyphs.stuck, Ink.STUCK)
        if view.pose is not None:
            self._draw_robot(cells, view.pose, old)
        return {spot: (char, Ink.OLD) for spot, (char, _) in cells.items()} if old else cells

    def _mark(self, cells: dict[Spot, Drawn], points: Iterable[Point], mark: str, ink: Ink) -> None:
        """One mark a point, beside a place's name rather than in it; what is sensed there stays behind the name."""
        for spot in filter(None, map(self._scale.spot, points)):
            if not self._in_name(spot):
                cells[spot] = (mark, ink)
            elif ink is Ink.STUCK:
                cells[self._beside_name(spot)] = (mark, ink)

    def _in_name(self, spot: Spot) -> bool:
        return self.still[spot[0]][spot[1]][1] in _NAMED

    def _beside_name(self, spot: Spot) -> Spot:
        """The cell just below or above, if the name leaves one; where a robot was stuck is never left out."""
        row, column = spot
        beside = [(row + 1, column), (row - 1, column)]
        return next((cell for cell in beside if 0 <= cell[0] < self._scale.rows and not self._in_name(cell)), spot)

    def _at_rest(self, wall: int, both: int) -> Drawn:
        if wall:
            return self._pattern(both if self._glyphs.dots else wall), Ink.WALL
        if both:
            return self._pattern(both) if self._glyphs.dots else self._glyphs.furniture, Ink.FURNITURE
        return " ", Ink.TEXT

    def _pattern(self, bits: int) -> str:
        return chr(0x2800 + bits) if self._glyphs.dots else _ASCII_PATTERNS[bits]

    def _dots(self, cells: dict[Spot, Drawn], dots: Iterable[tuple[int, int]], ink: Ink, plain: str) -> None:
        """Add dots to the cells, over what walls they have."""
        added: dict[Spot, int] = {}
        for row, column in dots:
            spot = (row // 4, column // 2)
            if 0 <= spot[0] < self._scale.rows and 0 <= spot[1] < self._scale.columns:
                added[spot] = added.get(spot, 0) | int(_DOT_BITS[row % 4, column % 2])
        for spot, bits in added.items():
            if not self._in_name(spot):
                cells[spot] = (self._pattern(bits | int(self._walls[spot])) if self._glyphs.dots else plain, ink)

    def _draw_doors(self) -> None:
        """One mark a cell along each door's leaf."""
        for door in self._site.doors:
            (x1, y1), (x2, y2) = door.start, door.end
            across = abs(x2 - x1) >= abs(y2 - y1)
            shut = door.name in self._shut
            mark = self._door_mark(across, shut)
            for row, column in stroke((door.start, door.end), self._scale, inset=0.2):
                spot = (row // 4, column // 2)
                if 0 <= spot[0] < self._scale.rows and 0 <= spot[1] < self._scale.columns:
                    self._bare[spot[0]][spot[1]] = (mark, Ink.SHUT if shut else Ink.DOOR)

    def _door_mark(self, across: bool, shut: bool) -> str:
        glyphs = self._glyphs
        if shut:
            return glyphs.shut_across if across else glyphs.shut_upright
        return glyphs.door_across if across else glyphs.door_upright

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

    def _draw_spread(self, cells: dict[Spot, Drawn], pose: Pose, radius: float) -> None:
        """A ring in which the robot takes itself to be, once it is wide enough to be told from the robot."""
        if radius * self._scale.dots_per_meter >= _RING_FROM:
            count = max(12, int(radius * self._scale.dots_per_meter * 2))
            turns = (math.tau * number / count for number in range(count))
            ring = ((pose.x + radius * math.cos(turn), pose.y + radius * math.sin(turn)) for turn in turns)
            self._dots(cells, map(self._scale.dot, ring), Ink.SPREAD, self._glyphs.trail)

    def _draw_robot(self, cells: dict[Spot, Drawn], pose: Pose, old: bool) -> None:
        corners = footprint_at(self._robot.footprint, pose)
        length = max(math.dist(a, b) for a in corners for b in corners) * self._scale.dots_per_meter
        if length >= _FOOTPRINT_FROM:
            self._dots(cells, stroke((*corners, corners[0]), self._scale), Ink.ROBOT, self._glyphs.outline)
        spot = self._scale.spot((pose.x, pose.y))
        if spot is not None:
            sectors = self._glyphs.heading
            turn = round(pose.heading / math.tau * len(sectors)) % len(sectors)
            cells[spot] = (self._glyphs.old_robot if old else sectors[turn], Ink.ROBOT)


def _dashes(route: Sequence[Point], scale: Scale) -> Iterable[tuple[int, int]]:
    """Every other pair of dots along a route: walls are unbroken, routes are not."""
    seen: dict[tuple[int, int], None] = dict.fromkeys(stroke(route, scale) if len(route) > 1 else ())
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
