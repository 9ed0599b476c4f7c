"""Things that people leave about: cartons at random times and places, some low, some moved elsewhere in between.

Times are a Poisson process (exponential gaps), thinned outside the hours. A thing is put down where it fits, off the
robot and off the places, and more often than not by a wall.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.sim.hours import within
from backends.sim.kernels.grid import value_at
from runner.site.values import DAY_S, Carton, Clutter, Point, Site

TRIES = 60
CANDIDATES = 6
"""Of so many spots where it fits, a thing put by a wall takes the one nearest to a wall."""
BY_A_WALL = 0.7
OFF_PLACES_M, OFF_ROBOT_M = 1.2, 1.5
SLACK_M = 0.1


@dataclass(slots=True)
class _Source:
    """One kind of clutter, and when its next thing is put down."""

    clutter: Clutter
    next_at: float


class Littering:
    """Draws what is put down, as cartons with their times."""

    def __init__(
        self, sources: Sequence[Clutter], site: Site, begins: float, generator: np.random.Generator | None
    ) -> None:
        """`begins` is the time of day at the beginning, seconds. ValueError where there is clutter and no generator."""
        self._site = site
        self._begins = begins
        if generator is None:
            if sources:
                raise ValueError("Clutter at random needs a source of random numbers.")
            generator = np.random.Generator(np.random.PCG64(0))
        self._random = generator
        self._sources = [_Source(one, self._gap(one)) for one in sources]

    def due(self, now: float, robot: Sequence[float], distance: NDArray[np.float32]) -> list[Carton]:
        """What is put down now or is sure to be put down later."""
        cartons: list[Carton] = []
        for source in self._sources:
            while source.next_at <= now:
                source.next_at += self._gap(source.clutter)
                if within(source.clutter.hours, (self._begins + now) % DAY_S):
                    cartons += self._drawn(source.clutter, now, robot, distance)
        return cartons

    def _gap(self, clutter: Clutter) -> float:
        return float(self._random.exponential(3600.0 / clutter.per_hour))

    def _drawn(
        self, clutter: Clutter, now: float, robot: Sequence[float], distance: NDArray[np.float32]
    ) -> list[Carton]:
        sides = self._random.uniform(*clutter.sides, 2)
        size = (float(sides[0]), float(sides[1]))
        stays = float(self._random.exponential(clutter.stays_s))
        low = bool(self._random.random() < clutter.low)
        times = [(now, now + stays)]
        if self._random.random() < clutter.moved:
            times = [(now, now + stays / 2.0), (now + stays / 2.0, now + stays)]
        spots = [self._spot(size, robot, distance) for _ in times]
        return [
            Carton(spot, size, begins, ends, low=low)
            for spot, (begins, ends) in zip(spots, times, strict=True)
            if spot is not None
        ]

    def _spot(self, size: Point, robot: Sequence[float], distance: NDArray[np.float32]) -> Point | None:
        """A spot where it fits; None where none was found in so many tries."""
        needed = 0.5 * math.hypot(*size) + SLACK_M
        found: list[tuple[float, Point]] = []
        wanted = CANDIDATES if self._random.random() < BY_A_WALL else 1
        for x, y in self._random.uniform((0.0, 0.0), (self._site.width, self._site.height), (TRIES, 2)).tolist():
            free = value_at(distance, x, y)
            if free >= needed and self._is_out_of_the_way(x, y, robot):
                found.append((free, (x, y)))
            if len(found) == wanted:
                break
        return min(found)[1] if found else None

    def _is_out_of_the_way(self, x: float, y: float, robot: Sequence[float]) -> bool:
        places = (place.pose for place in self._site.places)
        off_places = all(math.hypot(x - pose.x, y - pose.y) >= OFF_PLACES_M for pose in places)
        return off_places and math.hypot(x - robot[0], y - robot[1]) >= OFF_ROBOT_M
