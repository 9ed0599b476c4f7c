"""How a terminal's rows and columns are shared out, from its size alone.

From 60 columns on, the floor stands beside the steps and the feed runs below both. Narrower, everything is stacked,
and the floor is left out unless the terminal is tall. The header and the keys are always whole.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

HEADER_ROWS = 3
STACKED_BELOW = 60
"""Columns under which the steps go below the floor."""


@dataclass(frozen=True, slots=True)
class Arrangement:
    """Sizes in cells. `floor_rows` is 0 where there is no room for the floor."""

    stacked: bool
    floor_columns: int
    floor_rows: int
    steps_columns: int
    steps_rows: int
    feed_rows: int

    @property
    def body_rows(self) -> int:
        """Rows between the header and the rule."""
        return self.steps_rows + (self.floor_rows if self.stacked else 0)


def arrange(columns: int, rows: int, aspect: float) -> Arrangement:
    """Share out a terminal. `aspect` is the floor's width over its height; a cell is about twice as tall as wide."""
    body = max(rows - HEADER_ROWS - 2, 2)  # a rule above the feed, and the keys
    return _stacked(columns, body, aspect) if columns < STACKED_BELOW else _beside(columns, body, aspect)


def _beside(columns: int, body: int, aspect: float) -> Arrangement:
    feed = min(max(body // 4, 3), 14) if body >= 8 else 1
    floor_rows = body - feed
    least_steps = min(max(int(columns * 0.28), 22), 46)
    wanted = math.ceil(floor_rows * 2 * aspect)
    steps = max(least_steps, min(columns - wanted - 1, columns // 2))
    return Arrangement(False, columns - steps, floor_rows, steps, floor_rows, feed)


def _stacked(columns: int, body: int, aspect: float) -> Arrangement:
    wanted = math.ceil(columns / 2 / aspect)
    floor = min(wanted, body // 2) if body >= 20 else 0
    steps = max((body - floor) * 3 // 5, 1)
    return Arrangement(True, columns, floor, columns, steps, body - floor - steps)
