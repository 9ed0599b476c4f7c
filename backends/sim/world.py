"""What is really there: the floor, its doors and what was left on it, as rasters that change only at events.

The robot never sees this, except through its sensors and by running into it. A door or a carton that somebody stands
in the way of waits until the way is clear.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from backends.sim.clutter import Littering
from backends.sim.kernels.overlap import covers_solid
from backends.sim.outline import Outline
from runner.site.floor import Floor, clearance, doors_shut_at, rasterize
from runner.site.raster import polygon_cells
from runner.site.values import CELL_M, DAY_S, Bystander, Carton, Conditions, Site

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
    """The truth now. `blocked` and `distance` tell of all that stands on the floor, `sight` of what the lidar meets.

    Distances are 0 in blocked cells and at most `FIELD_REACH_M`. `walkable` is `distance` with those doors open that
    people can open. `shut` are the doors that are shut, `ajar` those of them that people shut and can open.
    """

    def __init__(
        self, site: Site, conditions: Conditions, begins: float, litter: np.random.Generator | None = None
    ) -> None:
        """`begins` is the time of day at which the run begins, in seconds. ValueError on an unknown door."""
        self._floor = _furnished(site, conditions)
        if unknown := [change.door for change in conditions.doors if change.door not in self._floor.doors]:
            raise ValueError(f'The conditions change a door that the site does not have: "{unknown[0]}".')
        self._site = site
        self._begins = begins
        self._changes = sorted(conditions.doors, key=lambda change: change.at_s)
        self._laid = [_Laid(carton, _carton_cells(carton, self._floor.shape)) for carton in conditions.cartons]
        self._littering = Littering(conditions.clutter, site, begins, litter)
        self.ajar: frozenset[str] = frozenset()
        self._locked: frozenset[str] = frozenset(self._doors_wanted(0.0))
        self.shut: frozenset[str] = self._locked
        self.blocked = self._floor.blocked(sorted(self.shut))
        self.distance = np.minimum(clearance(self.blocked), np.float32(FIELD_REACH_M))
        self.sight = self.walkable = self.distance
        self.changes = 0
        """How often the rasters have changed."""

    def advance(
        self, now: float, robot: Sequence[float], outline: Outline, people: NDArray[np.float64], whole_second: bool
    ) -> bool:
        """Let everything happen that is due; True where the raster changed. Doors are looked at once a second."""
        if whole_second:
            self._lay_more(self._littering.due(now, robot, self.distance))
        changed = [laid.cells for laid in self._laid if self._carton_event(laid, now, robot, outline, people)]
        if whole_second:
            changed += self._door_events(now, robot, outline, people)
        if changed:
            self._redraw(changed)
            self._laid = [laid for laid in self._laid if not laid.gone]
        return bool(changed)

    def open_door(self, name: str) -> None:
        """Somebody opens a door that somebody shut."""
        self._swing(name, self.ajar - {name})

    def shut_door(self, name: str, robot: Sequence[float], outline: Outline, people: NDArray[np.float64]) -> bool:
        """Somebody shuts a door, unless it is shut or anybody is in the way; whether it is shut now."""
        if name in self.shut or self._occupied(self._floor.doors[name], robot, outline, people):
            return False
        self._swing(name, self.ajar | {name})
        return True

    def what_stands_in(self, cells: NDArray[np.intp]) -> str:
        """What blocks any of these (n, 2) cells, as the site calls it: a door before a carton before other things."""
        for name in sorted(self.shut):
            if _share_any(cells, self._floor.doors[name]):
                return "door"
        if any(laid.down_at is not None and _share_any(cells, laid.cells) for laid in self._laid):
            return "carton"
        return "solid" if self.blocked[cells[:, 0], cells[:, 1]].any() else ""

    def _swing(self, name: str, ajar: frozenset[str]) -> None:
        self.ajar = ajar
        self.shut = self._locked | ajar
        self._redraw([self._floor.doors[name]])

    def _lay_more(self, cartons: Sequence[Carton]) -> None:
        self._laid += [_Laid(carton, _carton_cells(carton, self._floor.shape)) for carton in cartons]

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
        if wanted == self._locked:
            return []
        opened = self._locked - wanted
        closed = {
            name
            for name in wanted - self._locked
            if not self._occupied(self._floor.doors[name], robot, outline, people)
        }
        self._locked = (self._locked - opened) | closed
        self.ajar -= closed
        self.shut = self._locked | self.ajar
        return [self._floor.doors[name] for name in sorted(opened | closed)]

    def _carton_event(
        self, laid: _Laid, now: float, robot: Sequence[float], outline: Outline, people: NDArray[np.float64]
    ) -> bool:
        if laid.gone:
            return False
        if laid.down_at is not None:
            laid.gone = now >= taken_at(laid.carton, laid.down_at)
            return laid.gone
        if not is_due(laid.carton, now, robot) or self._occupied(laid.cells, robot, outline, people):
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

    def _redraw(self, changed: Sequence[NDArray[np.intp]]) -> None:
        """Rasters and distance fields after these groups of cells may have changed."""
        self.changes += 1
        tall = self._floor.blocked(sorted(self.shut))
        down = [laid for laid in self._laid if laid.down_at is not None and not laid.gone]
        for laid in down:
            if not laid.carton.low:
                tall[laid.cells[:, 0], laid.cells[:, 1]] = True
        self.blocked = tall
        if lows := [laid for laid in down if laid.carton.low]:
            self.blocked = tall.copy()
            for laid in lows:
                self.blocked[laid.cells[:, 0], laid.cells[:, 1]] = True
        for cells in changed:
            _renew(self.distance, self.blocked, cells)
        self.sight = _beside(self.sight, self.distance, tall, changed) if lows else self.distance
        self._redraw_walkable(changed)

    def _redraw_walkable(self, changed: Sequence[NDArray[np.intp]]) -> None:
        if not self.ajar:
            self.walkable = self.distance
            return
        free = self.blocked.copy()
        for name in sorted(self.ajar):
            leaf = self._floor.doors[name]
            free[leaf[:, 0], leaf[:, 1]] = self._floor.solid[leaf[:, 0], leaf[:, 1]]
        self.walkable = _beside(self.walkable, self.distance, free, changed)


def _furnished(site: Site, conditions: Conditions) -> Floor:
    """The floor as it really is: without what is missing, with what is there and not on the map."""
    solids = (*(one for one in site.solids if one not in conditions.missing), *conditions.extra)
    return rasterize(replace(site, solids=solids))


def _beside(
    field: NDArray[np.float32],
    main: NDArray[np.float32],
    blocked: NDArray[np.bool_],
    changed: Sequence[NDArray[np.intp]],
) -> NDArray[np.float32]:
    """A field beside the main one, right after a change: a copy of it where it was the same until then."""
    field = main.copy() if field is main else field
    for cells in changed:
        _renew(field, blocked, cells)
    return field


def _renew(field: NDArray[np.float32], blocked: NDArray[np.bool_], changed: NDArray[np.intp]) -> None:
    """Make a distance field right around cells that may have changed."""
    reach = math.ceil(FIELD_REACH_M / CELL_M) + 1
    low, high = changed.min(axis=0), changed.max(axis=0) + 1
    rows = slice(max(low[0] - reach, 0), high[0] + reach)
    columns = slice(max(low[1] - reach, 0), high[1] + reach)
    wide_rows = slice(max(low[0] - 2 * reach, 0), high[0] + 2 * reach)
    wide_columns = slice(max(low[1] - 2 * reach, 0), high[1] + 2 * reach)
    # clearance() takes what lies outside the part as blocked; that is at least `reach` from what is written back,
    # or is the edge of the floor and rightly so.
    part = np.minimum(clearance(blocked[wide_rows, wide_columns]), np.float32(FIELD_REACH_M))
    inner_rows = slice(rows.start - wide_rows.start, rows.stop - wide_rows.start)
    inner_columns = slice(columns.start - wide_columns.start, columns.stop - wide_columns.start)
    field[rows, columns] = part[inner_rows, inner_columns]


def _share_any(some: NDArray[np.intp], others: NDArray[np.intp]) -> bool:
    """Whether two lists of cells have any cell in common."""
    width = 1 << 20
    return bool(np.isin(some[:, 0] * width + some[:, 1], others[:, 0] * width + others[:, 1]).any())


def is_due(carton: Carton | Bystander, now: float, robot: Sequence[float]) -> bool:
    """Whether something is to be there by its own times and by where the robot is."""
    if now < carton.from_s or (carton.until_s is not None and now >= carton.until_s):
        return False
    if carton.when_near is None:
        return True
    return math.hypot(robot[0] - carton.at[0], robot[1] - carton.at[1]) <= carton.when_near


def taken_at(carton: Carton | Bystander, down_at: float) -> float:
    """When something that is there since `down_at` is to go; infinity for never."""
    ends = [] if carton.until_s is None else [carton.until_s]
    if carton.stays_s is not None:
        ends.append(down_at + carton.stays_s)
    return min(ends, default=math.inf)


def _carton_cells(carton: Carton, shape: tuple[int, int]) -> NDArray[np.intp]:
    (x, y), (width, height) = carton.at, carton.size
    left, right, low, high = x - width / 2, x + width / 2, y - height / 2, y + height / 2
    return polygon_cells(((left, low), (right, low), (right, high), (left, high)), shape)
