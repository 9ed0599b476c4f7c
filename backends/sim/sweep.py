"""A slow sensor that sees low things: it looks at a few columns a tick, so what it shows of most places is old.

Each column is put into the memory from where the robot believed it was when it looked there. A carton put down behind
the sweep is found when the sweep comes round again.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.sight import columns
from backends.sim.memory import Memory
from runner.site.values import Pose, Sweep

TICKS_PER_LOOK = 2
"""Columns are looked at together every so many ticks, which is cheaper than a few every tick."""


class Sweeper:
    """Looks from right to left once in a period, then begins again at the right."""

    def __init__(self, sweep: Sweep, ticks_per_s: int, generator: np.random.Generator) -> None:
        self._sweep = sweep
        self._random = generator
        self._ticks = max(1, round(sweep.period * ticks_per_s))
        self._tick = self._next = 0
        self._step = sweep.field_of_view / sweep.columns
        self._ranges, self._normal = np.zeros(sweep.columns), np.zeros(sweep.columns)

    def look(
        self, true: Pose, believed: Pose, distance: NDArray[np.float32], people: NDArray[np.float64], memory: Memory
    ) -> None:
        """Look at the columns of one tick, or every so many ticks. `distance` is the world's at floor level."""
        sweep = self._sweep
        self._tick = self._tick % self._ticks + 1
        if self._tick % TICKS_PER_LOOK and self._tick != self._ticks:
            return
        low, high = self._next, sweep.columns * self._tick // self._ticks
        self._next = high % sweep.columns
        if low == high:
            return
        ranges, normal = self._ranges[: high - low], self._normal[: high - low]
        self._random.standard_normal(out=normal)
        turned = (low + 0.5) * self._step - 0.5 * sweep.field_of_view
        x, y = _eye(true, sweep)
        columns(distance, people, x, y, true.heading + turned, self._step, sweep.range_max, sweep.noise, normal, ranges)
        x, y = _eye(believed, sweep)
        memory.take_columns(ranges, x, y, believed.heading + turned, self._step, sweep)


def _eye(pose: Pose, sweep: Sweep) -> tuple[float, float]:
    return pose.x + sweep.forward * math.cos(pose.heading), pose.y + sweep.forward * math.sin(pose.heading)
