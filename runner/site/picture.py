"""A picture of a floor as cells and as rectangles: what is wall, what is free, what was never seen.

A picture has its row 0 at the top; a floor has its row 0 at the lowest y. A cell (5 cm, as on a site) takes
the worst of the pixels it overlaps, so that no wall is lost. Unseen cells are kept apart, and count as solid.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from runner.site.values import CELL_M, Point

FREE, UNSEEN, WALL = range(3)
EDGE = 1e-6
"""Of a pixel: what a cell overlaps by less than this it does not overlap."""

Kinds = NDArray[np.uint8]
"""FREE, UNSEEN or WALL for each pixel or cell."""

Rectangle = tuple[int, int, int, int]
"""First column, first row, column after the last, row after the last; cells of a floor."""


class PictureError(ValueError):
    """The picture does not make a floor; the sentence says why and what to do."""


@dataclass(frozen=True, slots=True)
class Placing:
    """`scale` is the side of a pixel in meters; `corner` is where the picture's lower left corner lies on the site."""

    scale: float
    corner: Point = (0.0, 0.0)


def placed_by(scale: float, known: Point, column: float, row: float, rows: int) -> Placing:
    """The placing such that the middle of a pixel (column, row from the top) is at a known point of the site."""
    return Placing(scale, (known[0] - (column + 0.5) * scale, known[1] - (rows - row - 0.5) * scale))


def kinds_of(gray: NDArray[np.uint8], wall: tuple[int, int], free: tuple[int, int]) -> Kinds:
    """Each pixel by its gray, 0 (black) to 255; both ends of a range belong to it, and what is in neither is unseen."""
    kinds = np.full(gray.shape, UNSEEN, dtype=np.uint8)
    kinds[(gray >= free[0]) & (gray <= free[1])] = FREE
    kinds[(gray >= wall[0]) & (gray <= wall[1])] = WALL
    return kinds


def cells_of_picture(kinds: Kinds, placing: Placing) -> Kinds:
    """The cells of the floor, row 0 at the lowest y. PictureError where something free lies below or left of 0, 0."""
    upright = kinds[::-1]
    rows = _overlapped(upright.shape[0], placing.corner[1], placing.scale)
    columns = _overlapped(upright.shape[1], placing.corner[0], placing.scale)
    _refuse_lost(upright, placing)
    return _worst(_worst(upright, rows).T, columns).T


def _refuse_lost(upright: Kinds, placing: Placing) -> None:
    for axis, low, name in ((1, placing.corner[0], "x"), (0, placing.corner[1], "y")):
        lost = max(0, math.floor(-low / placing.scale + EDGE))
        if lost and bool((np.take(upright, range(min(lost, upright.shape[axis])), axis=axis) == FREE).any()):
            raise PictureError(
                f"Free floor of the picture lies below {name} 0, down to {low:.2f} m, and a site begins at 0. "
                f"Add at least {-low:.2f} m to the {name} of the known point."
            )


def _overlapped(pixels: int, low: float, scale: float) -> NDArray[np.int64]:
    """For each cell of a side the first pixel it overlaps and the one after the last, shape (cells, 2)."""
    count = math.ceil((low + pixels * scale) / CELL_M - EDGE)
    if count < 1:
        raise PictureError("The whole picture lies beyond the floor. Look at the known point.")
    edges = (np.arange(count + 1) * CELL_M - low) / scale
    first = np.floor(edges[:-1] + EDGE).astype(np.int64)
    after = np.ceil(edges[1:] - EDGE).astype(np.int64)
    return np.stack([first, np.maximum(after, first + 1)], axis=1)


def _worst(kinds: Kinds, spans: NDArray[np.int64]) -> Kinds:
    """The worst kind along axis 0 in each span; beyond the picture nothing was seen."""
    padded = np.vstack([kinds, np.full((1, kinds.shape[1]), UNSEEN, dtype=np.uint8)])
    beyond = len(kinds)
    worst = np.zeros((len(spans), kinds.shape[1]), dtype=np.uint8)
    for offset in range(int((spans[:, 1] - spans[:, 0]).max())):
        index = np.minimum(spans[:, 0] + offset, spans[:, 1] - 1)
        index = np.where((index < 0) | (index >= beyond), beyond, index)
        worst = np.maximum(worst, padded[index])
    return worst


def rectangles(cells: NDArray[np.bool_]) -> Iterator[Rectangle]:
    """Rectangles that cover exactly the True cells: runs along a row, joined with equal runs above them."""
    growing: dict[tuple[int, int], int] = {}
    for row in range(len(cells) + 1):
        runs = set(_runs(cells[row])) if row < len(cells) else set()
        for run in [run for run in growing if run not in runs]:
            yield run[0], growing.pop(run), run[1], row
        for run in sorted(runs):
            growing.setdefault(run, row)


def _runs(row: NDArray[np.bool_]) -> Iterator[tuple[int, int]]:
    edges = np.flatnonzero(np.diff(np.concatenate(([False], row, [False])).astype(np.int8)))
    for begin, end in zip(edges[::2], edges[1::2], strict=True):
        yield int(begin), int(end)


def widest_spot(cells: Kinds) -> Point:
    """The middle of the free cell farthest from everything else. PictureError where nothing is free."""
    from runner.site.floor import center_of, clearance

    field = clearance(cells != FREE)
    if not field.any():
        raise PictureError("Nothing in the picture is free floor. Look at the gray ranges.")
    row, column = np.unravel_index(int(field.argmax()), field.shape)
    return center_of((int(row), int(column)))


def site_text(name: str, cells: Kinds, remark: str) -> str:
    """A site file: the floor, its solids as rectangles, and one place to begin with."""
    rows, columns = cells.shape
    lines = [
        f"# {remark}",
        f"site: {name}",
        f"floor: {_meters(columns)} m x {_meters(rows)} m",
        "coordinates: in meters",
        "",
    ]
    lines += ["solids:"] if (cells != FREE).any() else []
    for kind, title in ((WALL, "Walls and furniture."), (UNSEEN, "Never seen, so nobody drives there.")):
        shapes = list(rectangles(cells == kind))
        lines += [f"  # {title}"] if shapes else []
        lines += [
            f"  - {{rectangle: [[{_meters(left)}, {_meters(low)}], [{_meters(right)}, {_meters(high)}]]}}"
            for left, low, right, high in shapes
        ]
    x, y = widest_spot(cells)
    lines += ["", "places:", "  # The roomiest spot, to begin with. Write your own places here.", "  middle:"]
    lines[-1] += f" {{at: [{x:.3f}, {y:.3f}], facing: east}}"
    return "\n".join(lines) + "\n"


def _meters(cells: int) -> str:
    return f"{cells * CELL_M:.2f}".rstrip("0").rstrip(".")
