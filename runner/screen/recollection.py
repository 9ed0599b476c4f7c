"""What a screen remembers of the views it was told: where the robot has been, and what was in its way.

A view says what is so now. The trail, things that the robot told of a while ago and no longer does, and where there
was trouble, are kept here. It is bounded, whatever the length of a night.
"""

from __future__ import annotations

import math
from collections import deque
from collections.abc import Iterable

from runner.host.view import FeedLine, View
from runner.site.values import Point

TRAIL_EVERY_M, TRAIL_POINTS = 0.3, 400
BEFORE_S, BEFORE_POINTS = 120.0, 400
TROUBLES_MOST = 200
_SAME_M = 0.25
"""Points that are told of within this distance of each other are the same thing."""

_Tile = tuple[int, int]


class Recollection:
    """Bounded memories of one run, oldest forgotten first."""

    def __init__(self, troubles: Iterable[Point] = (), way: Iterable[Point] = ()) -> None:
        self.trail: deque[Point] = deque(maxlen=TRAIL_POINTS)
        self._troubles: dict[Point, None] = {}
        self._told: dict[_Tile, tuple[Point, float]] = {}
        self._now: set[_Tile] = set()
        for point in troubles:
            self._keep_trouble(point)
        for point in way:
            self._go_to(point)

    @property
    def troubles(self) -> Iterable[Point]:
        """Where incidents began."""
        return self._troubles

    def before(self) -> list[Point]:
        """What was told of in the last two minutes of the run and no longer is, because it is gone or out of reach."""
        return [point for tile, (point, _) in self._told.items() if tile not in self._now]

    def take(self, view: View) -> None:
        """Remember a view."""
        if view.pose is not None:
            self._go_to((view.pose.x, view.pose.y))
        self._now = set()
        for x, y in view.obstacles:
            tile = (math.floor(x / _SAME_M), math.floor(y / _SAME_M))
            self._now.add(tile)
            self._told.pop(tile, None)
            self._told[tile] = ((x, y), view.stamp)
        self._forget(view.stamp)

    def take_lines(self, lines: Iterable[FeedLine]) -> None:
        """Remember where there was trouble."""
        for line in lines:
            if line.at is not None:
                self._keep_trouble(line.at)

    def _go_to(self, here: Point) -> None:
        if not self.trail or math.dist(self.trail[-1], here) >= TRAIL_EVERY_M:
            self.trail.append(here)

    def _keep_trouble(self, point: Point) -> None:
        self._troubles[round(point[0], 2), round(point[1], 2)] = None
        while len(self._troubles) > TROUBLES_MOST:
            del self._troubles[next(iter(self._troubles))]

    def _forget(self, stamp: float) -> None:
        """What was told of too long ago. The oldest stand first."""
        while self._told:
            tile = next(iter(self._told))
            if stamp - self._told[tile][1] <= BEFORE_S and len(self._told) <= BEFORE_POINTS:
                return
            del self._told[tile]
