"""Routes over a floor: the cheapest way on the 8-connected grid, exact, without cutting corners.

A step to a neighbor costs the mean of the two cells' weights times its length in cells (1, or the square root of 2).
A diagonal step is allowed only where both cells beside it are free. A weight of infinity is a blocked cell.
The search is A* (Hart, Nilsson and Raphael, 1968); the kernel is in `runner.site.route_kernels`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from runner.site.floor import Cell
from runner.site.values import CELL_M

Weights = NDArray[np.float32] | NDArray[np.float64]

NOTHING_KNOWN: NDArray[np.float32] = np.empty(0, dtype=np.float32)
"""Of the costs ahead: then the distance and the least weight bound them."""


@dataclass(frozen=True, slots=True)
class GridRoute:
    """A route from start to goal: its cells (n, 2), both ends included; its cost; its length in meters."""

    cells: NDArray[np.intp]
    cost: float
    length: float

    def points(self) -> NDArray[np.float64]:
        """The centers of the cells as x, y in the site frame, meters, shape (n, 2)."""
        return (self.cells[:, ::-1].astype(np.float64) + 0.5) * CELL_M


def weight_from_clearance(
    clearance: NDArray[np.float32], hard: float, soft: float, strength: float
) -> NDArray[np.float32]:
    """Weights that keep a route away from walls where there is room, and let it through where there is not.

    Blocked below `hard` meters of clearance; 1 from `soft` meters on; between them it rises with the square of what
    is missing, to 1 + `strength` at `hard`.
    """
    missing = np.clip((soft - clearance) / max(soft - hard, 1e-9), 0.0, 1.0)
    weight = 1.0 + strength * missing * missing
    return np.where(clearance < hard, np.inf, weight).astype(np.float32)


def find_route(
    weight: Weights, start: Cell, goal: Cell, ahead: NDArray[np.float32] = NOTHING_KNOWN
) -> GridRoute | None:
    """The cheapest route, or None where there is none or where an end is blocked or off the grid.

    `weight` has shape (rows, columns), positive, infinite where blocked. Costs are summed in double precision. The
    same arguments give the same cells. `ahead` is what `costs_ahead` gives for this goal on weights that are nowhere
    higher than these: the nearer those are, the fewer cells are looked at. ValueError on a weight that is not positive.
    """
    if not (_is_open(weight, start) and _is_open(weight, goal)):
        return None
    from runner.site.route_kernels import search

    cells, cost = search(np.ascontiguousarray(weight), *start, *goal, ahead, *_span(weight))
    if len(cells) == 0:
        return None
    return GridRoute(cells, float(cost), _length(cells))


def costs_ahead(weight: Weights, goal: Cell) -> NDArray[np.float32]:
    """A bound, for `find_route`, of the cost from each cell to a goal. Worth having where weights rise now and then.

    The cost on these weights, which is the best bound there is (Hart, Nilsson and Raphael, 1968), found once by going
    out from the goal (Dijkstra, 1959). ValueError on a weight that is not positive.
    """
    from runner.site.route_kernels import costs_to

    if not _is_open(weight, goal):
        return NOTHING_KNOWN
    return np.asarray(costs_to(np.ascontiguousarray(weight), *goal, *_span(weight)), dtype=np.float32)


def is_joined(weight: Weights, start: Cell, goal: Cell) -> bool:
    """Whether there is a route at all: sooner told than found, above all where one end is shut in."""
    from runner.site.route_kernels import joined

    both_open = _is_open(weight, start) and _is_open(weight, goal)
    return both_open and bool(joined(np.ascontiguousarray(weight), *start, *goal))


def _span(weight: Weights) -> tuple[float, float]:
    """The least weight, and the highest that is not infinite."""
    least = float(np.min(weight))
    if not least > 0.0:
        raise ValueError("Every weight of a grid must be above 0.")
    return least, float(np.max(weight, where=np.isfinite(weight), initial=least))


def regions(free: NDArray[np.bool_]) -> NDArray[np.int32]:
    """A number for each cell, 0 where not free: two cells have a route between them where the numbers are the same.

    A diagonal step that cuts no corner can be made in two straight ones, so regions connected by sides are enough.
    """
    from scipy.ndimage import label

    return np.asarray(label(free)[0], dtype=np.int32)


def _is_open(weight: Weights, cell: Cell) -> bool:
    rows, columns = weight.shape
    return 0 <= cell[0] < rows and 0 <= cell[1] < columns and math.isfinite(weight[cell])


def _length(cells: NDArray[np.intp]) -> float:
    diagonals = int(np.count_nonzero(np.abs(np.diff(cells, axis=0)).sum(axis=1) == 2))
    straights = len(cells) - 1 - diagonals
    return (straights + diagonals * math.sqrt(2.0)) * CELL_M
