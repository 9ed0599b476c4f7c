"""The bodies of people as arrays, and how they get from bend to bend. The forces between them are in `kernels.crowd`.

Whoever is not about is kept off the floor, far away, so that an index means the same person all night.
"""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.crowd import keep_together, step
from backends.sim.kernels.errands import NOBODY, next_due
from backends.sim.outline import Outline
from backends.sim.world import World
from runner.site.values import Point

OFF_THE_FLOOR = -1000.0
PASS_M, ARRIVE_M = 0.5, 0.2
"""How near a bend, and the end, counts as there."""
PATIENCE_S = 6.0
"""After this long on the way to one bend a person looks for another way, or gives up."""


class Footwork:
    """`bodies` has rows (x, y, radius), true now; `wished` is the speed wanted, 0 for who stands.

    `speeds` is what each likes to walk, `wake` when each wants to be asked again. The arrays are changed in place.
    """

    def __init__(self, radii: NDArray[np.float64], speeds: NDArray[np.float64]) -> None:
        count = len(radii)
        self.bodies = np.full((count, 3), OFF_THE_FLOOR)
        self.bodies[:, 2] = radii
        self.velocity = np.zeros((count, 2))
        self.target = np.zeros((count, 3))
        self.wished = np.zeros(count)
        self.wake = np.full(count, math.inf)
        self.speeds = speeds
        self.leader = np.arange(count)
        """Whom each walks with; oneself where nobody else."""
        self._ways: list[NDArray[np.float64]] = [np.empty((0, 2))] * count
        self._in_groups = False

    def join(self, one: int, leader: int) -> None:
        """Let one walk with a leader from now on, at the leader's speed."""
        self.leader[one] = leader
        self.speeds[one] = self.speeds[leader]
        self._in_groups = True

    def step(self, world: World, robot: NDArray[np.float64], outline: Outline, time: float) -> None:
        """Move everybody by one tick. `robot` is (x, y, heading)."""
        if self._in_groups:
            keep_together(self.bodies, self.target, self.wished, self.speeds, self.leader)
        step(
            self.bodies, self.velocity, self.target, self.wished, world.distance,
            outline.hull, outline.outer, robot, time,
        )  # fmt: skip

    def due(self, now: float) -> Iterator[int]:
        """Those who have come to their target or want to be asked again, in order."""
        one = next_due(0, self.bodies, self.target, self.wished, self.wake, now)
        while one != NOBODY:
            yield one
            one = next_due(one + 1, self.bodies, self.target, self.wished, self.wake, now)

    def is_about(self, one: int) -> bool:
        return bool(self.bodies[one, 0] != OFF_THE_FLOOR)

    def where(self, one: int) -> Point:
        return float(self.bodies[one, 0]), float(self.bodies[one, 1])

    def appear(self, one: int, spot: Point) -> None:
        """Stand on the floor, at a spot."""
        self.bodies[one, :2] = spot

    def vanish(self, one: int, until: float) -> None:
        """Leave the floor, and want to be asked again at a time."""
        self.stand(one, until)
        self.bodies[one, :2] = OFF_THE_FLOOR

    def stand(self, one: int, until: float) -> None:
        """Stand still until a time."""
        self.wished[one] = 0.0
        self._ways[one] = np.empty((0, 2))
        self.wake[one] = until

    def walks(self, one: int) -> bool:
        return bool(self.wished[one] > 0.0)

    def walk(self, one: int, way: NDArray[np.float64], now: float) -> None:
        """Walk along points (n, 2), straight from one to the next."""
        self._ways[one] = way
        self.wished[one] = self.speeds[one]
        self.next_bend(one, now)

    def next_bend(self, one: int, now: float) -> bool:
        """Make for the next point of the way; False where there is none left."""
        way = self._ways[one]
        if not len(way):
            return False
        self.target[one, :2] = way[0]
        self.target[one, 2] = PASS_M if len(way) > 1 else ARRIVE_M
        self._ways[one] = way[1:]
        walk = math.dist(way[0], self.bodies[one, :2]) / self.speeds[one]
        self.wake[one] = now + walk + PATIENCE_S
        return True
