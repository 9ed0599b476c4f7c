"""What is really there: the floor, its doors and what was left on it, as a raster that changes only at events.

The robot never sees this, except through its lidar and by running into it. A door or a carton that somebody stands
in the way of waits until the way is clear.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.overlap import covers_solid
from backends.sim.outline import Outline
from runner.site.floor import Floor, clearance, doors_shut_at
from runner.site.raster import polygon_cells
from runner.site.values import CELL_M, DAY_S, Carton, Conditions, Site

FIELD_REACH_M = 2.0
"""The distance field is exact up to this distance and says this beyond it, so that a change stays local."""
ELBOW_M = 0.05
"""Something is put down only where it is at least this far from anybody."""


@dataclass(slots=True)
class _Laid:
    """A carton of the conditions, the cells it covers, and when it was put down (None: not yet) or is taken up."""

    carton: Carton
    cells: NDArray[np.intp]
    down_at: float | None = None
    gone: bool = False


class World:
    """`blocked` and `distance` are the truth now. `distance` is 0 in blocked cells and at most `FIELD_REACH_M`."""

    def __init__(self, site: Site, floor: Floor, conditions: Conditions, begins: float) -> None:
        """`begins` is the time of day at which the run begins, in seconds. ValueError on an unknown door."""
        if unknown := [change.door for change in conditions.doors if change.door not in floor.doors]:
            raise ValueError(f'The conditions change a door that the site does not have: "{unknown[0]}".')
        self._site = site
        self._floor = floor
        self._begins = begins
        self._changes = sorted(conditions.doors, key=lambda change: change.at_s)
        self._laid = [_Laid(carton, _carton_cells(carton, floor.shape)) for carton in conditions.cartons]
        self.shut: frozenset[str] = frozenset(self._doors_wanted(0.0))
        self.blocked = floor.blocked(sorted(self.shut))
        self.distance = np.minimum(clearance(self.blocked), np.float32(FIELD_REACH_M))

    def advance(
        self, now: float, robot: Sequence[float], outline: Outline, people: NDArray[np.float64], whole_second: bool
    ) -> bool:
        """Let everything happen that is due; True where the raster changed. Doors are looked at once a second."""
        changed = [laid.cells for laid in self._laid if self._carton_event(laid, now, robot, outline, people)]
        if whole_second:
            changed += self._door_events(now, robot, outline, people)
        if changed:
            self._redraw(np.concatenate(changed))
        return bool(changed)

    def _doors_wanted(self, now: float) -> set[str]:
        """The doors that are meant to be shut: by their hours, or by the last change of the conditions."""
        shut = set(doors_shut_at(self._site, (self._begins + now) % DAY_S))
        for change in self._changes:
            if change.at_s <= now:
                (shut.discard if change.open else shut.add)(change.door)
        return shut

    def _door_events(
        self, now: float, robot: Sequence[float], outline: Outline, people: NDArray[np.float64]
    ) -> list[NDArray[np.intp]]:
        wanted = self._doors_wanted(now)
        if wanted == self.shut:
            return []
        opened = self.shut - wanted
        closed = {
            name for name in wanted - self.shut if not self._occupied(self._floor.doors[name], robot, outline, people)
        }
        self.shut = (self.shut - opened) | closed
        return [self._floor.doors[name] for name in sorted(opened | closed)]

    def _carton_event(
        self, laid: _Laid, now: float, robot: Sequence[float], outline: Outline, people: NDArray[np.float64]
    ) -> bool:
        if laid.gone:
            return False
        if laid.down_at is not None:
            laid.gone = now >= _taken_at(laid.carton, laid.down_at)
            return laid.gone
        if not _is_due(laid.carton, now, robot) or self._occupied(laid.cells, robot, outline, people):
            return False
        laid.down_at = now
        return True

    def _occupied(
        self, cells: NDArray[np.intp], robot: Sequence[float], outline: Outline, people: NDArray[np.float64]
    ) -> bool:
        """Whether the robot or a person stands on the cells, or within elbow room of them."""
        mask = np.zeros_like(self.blocked)
        mask[cells[:, 0], cells[:, 1]] = True
        if covers_solid(mask, outline.hull, robot[0], robot[1], robot[2]):
            return True
        centers = (cells[:, ::-1] + 0.5) * CELL_M
        return any(
            bool((np.hypot(centers[:, 0] - x, centers[:, 1] - y) < radius + ELBOW_M).any()) for x, y, radius in people
        )

    def _redraw(self, changed: NDArray[np.intp]) -> None:
        """Raster and distance field after the given cells may have changed."""
        self.blocked = self._floor.blocked(sorted(self.shut))
        for laid in self._laid:
            if laid.down_at is not None and not laid.gone:
                self.blocked[laid.cells[:, 0], laid.cells[:, 1]] = True
        reach = math.ceil(FIELD_REACH_M / CELL_M) + 1
        low, high = changed.min(axis=0), changed.max(axis=0) + 1
        rows = slice(max(low[0] - reach, 0), high[0] + reach)
        columns = slice(max(low[1] - reach, 0), high[1] + reach)
        wide_rows = slice(max(low[0] - 2 * reach, 0), high[0] + 2 * reach)
        wide_columns = slice(max(low[1] - 2 * reach, 0), high[1] + 2 * reach)
        # clearance() takes what lies outside the part as blocked; that is at least `reach` from what is written back,
        # or is the edge of the floor and rightly so.
        part = np.minimum(clearance(self.blocked[wide_rows, wide_columns]), np.float32(FIELD_REACH_M))
        inner_rows = slice(rows.start - wide_rows.start, rows.stop - wide_rows.start)
        inner_columns = slice(columns.start - wide_columns.start, columns.stop - wide_columns.start)
        self.distance[rows, columns] = part[inner_rows, inner_columns]


def _is_due(carton: Carton, now: float, robot: Sequence[float]) -> bool:
    if now < carton.from_s or (carton.until_s is not None and now >= carton.until_s):
        return False
    if carton.when_near is None:
        return True
    return math.hypot(robot[0] - carton.at[0], robot[1] - carton.at[1]) <= carton.when_near


def _taken_at(carton: Carton, down_at: float) -> float:
    ends = [] if carton.until_s is None else [carton.until_s]
    if carton.stays_s is not None:
        ends.append(down_at + carton.stays_s)
    return min(ends, default=math.inf)


def _carton_cells(carton: Carton, shape: tuple[int, int]) -> NDArray[np.intp]:
    (x, y), (width, height) = carton.at, carton.size
    left, right, low, high = x - width / 2, x + width / 2, y - height / 2, y + height / 2
    return polygon_cells(((left, low), (right, low), (right, high), (left, high)), shape)
