"""The robot's memory of obstacles as arithmetic: evidence per cell, and a distance field kept up to date with it.

Evidence is counted in scans: a scan that hits a cell adds one, up to a cap; a scan with a beam that passes through the
cell and comes back from beyond it takes one away. A beam that does not come back says nothing. Cells with evidence
stand in a list, so that a scan costs by what is remembered and not by the size of the floor.

The columns of a sweep count likewise, each for as many scans as are taken meanwhile. What only the sweep saw is low:
the lidar looks over it, so its beams take nothing from it. Cells cleared and not seen since stand in their own list.

`field` is the distance to the nearest solid cell of the map or remembered cell, right up to the radius of `disc`
and the map's own beyond it.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid, motion, overlap
from backends.sim.kernels.grid import CELLS_PER_M, bearing_of, value_at
from backends.sim.kernels.overlap import gap
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__, motion.__file__, overlap.__file__)

CELL = 0.05
BEYOND = 1.5 * CELL  # a return must come from this far behind a cell's center to have passed it
TURN = 2.0 * math.pi
PER_TURN = 1.0 / TURN
TILE = 16
CONFIRMED, GLIMPSE = 4, 32  # hits that make a memory, and looks (scans and parts of sweeps) for which fewer last
UNTOLD, PASSED, OPEN = 0, 1, 2
BY_LIDAR, BY_SWEEP = 0, 1  # which sensor saw what stands in a cell


@kernel
def lower(
    field: NDArray[Any],
    disc: NDArray[Any],
    row: int,
    column: int,
    low_row: int,
    high_row: int,
    low_column: int,
    high_column: int,
) -> None:
    """Lower the field around a remembered cell within bounds (high ones not included).

    `disc` holds the distances of a square patch around its middle. Unsigned indices let the inner loop be vectorized.
    """
    reach = disc.shape[0] // 2
    first, last = max(column - reach, low_column), min(column + reach + 1, high_column)
    if first >= last:
        return
    length, target, source = np.uint64(last - first), np.uint64(first), np.uint64(first + reach - column)
    for r in range(max(row - reach, low_row), min(row + reach + 1, high_row)):
        field_row, disc_row = np.uint64(r), np.uint64(r - row + reach)
        for index in range(length):
            old, new = field[field_row, target + index], disc[disc_row, source + index]
            field[field_row, target + index] = new if new < old else old


@kernel
def paint(field: NDArray[Any], disc: NDArray[Any], row: int, column: int) -> None:
    """Lower the field around one newly remembered cell."""
    lower(field, disc, row, column, 0, field.shape[0], 0, field.shape[1])


@kernel
def repaint(
    field: NDArray[Any], known: NDArray[Any], disc: NDArray[Any], cells: NDArray[Any], count: int, lost: NDArray[Any]
) -> None:
    """Make the field right after the cells in `lost` were forgotten: tile by tile, so that it costs by what is near.

    A tile of `TILE` cells square is done over once, with all around it that a lost cell in it may have lowered.
    """
    columns = field.shape[1]
    across = columns // TILE + 1
    boxes = np.empty((lost.shape[0], 4), dtype=np.int64)
    tiles = np.empty(lost.shape[0], dtype=np.int64)
    used = 0
    for index in range(lost.shape[0]):
        row, column = lost[index] // columns, lost[index] % columns
        tile = (row // TILE) * across + column // TILE
        place = 0
        while place < used and tiles[place] != tile:
            place += 1
        if place == used:
            tiles[used] = tile
            boxes[used, 0], boxes[used, 1], boxes[used, 2], boxes[used, 3] = row, column, row, column
            used += 1
        boxes[place, 0], boxes[place, 1] = min(boxes[place, 0], row), min(boxes[place, 1], column)
        boxes[place, 2], boxes[place, 3] = max(boxes[place, 2], row), max(boxes[place, 3], column)
    for place in range(used):
        restore(field, known, disc, cells, count, boxes[place])


@kernel
def restore(
    field: NDArray[Any], known: NDArray[Any], disc: NDArray[Any], cells: NDArray[Any], count: int, box: NDArray[Any]
) -> None:
    """Do the field over where cells inside `box` (low row, low column, high row, high column) had lowered it."""
    reach = disc.shape[0] // 2
    rows, columns = field.shape
    low_row, high_row = max(box[0] - reach, 0), min(box[2] + reach + 1, rows)
    low_column, high_column = max(box[1] - reach, 0), min(box[3] + reach + 1, columns)
    for r in range(low_row, high_row):
        for c in range(low_column, high_column):
            field[r, c] = known[r, c]
    for index in range(count):
        row, column = cells[index] // columns, cells[index] % columns
        if low_row - reach <= row < high_row + reach:
            lower(field, disc, row, column, low_row, high_row, low_column, high_column)


@kernel
def looked(
    ranges: NDArray[Any], x: float, y: float, first: float, step: float, cell_x: float, cell_y: float, reach: float
) -> int:
    """What the beam nearest to a cell's center, as wide as the step to the next, tells of the cell.

    `PASSED` where it comes back from beyond the cell, `OPEN` where it does not come back at all, else `UNTOLD`, as
    where the cell is farther than `reach`.
    """
    to_x, to_y = cell_x - x, cell_y - y
    apart = math.sqrt(to_x * to_x + to_y * to_y)
    if apart > reach:
        return UNTOLD
    bearing = bearing_of(to_y, to_x) - first
    bearing -= math.floor(bearing * PER_TURN) * TURN
    beam = int(bearing / step + 0.5)
    off = abs(bearing - beam * step)
    if beam >= ranges.shape[0]:
        beam, off = 0, TURN - bearing
    if off > 0.5 * step:
        return UNTOLD
    if ranges[beam] == np.inf:
        return OPEN
    return PASSED if apart + BEYOND < ranges[beam] else UNTOLD


@kernel
def take_hits(
    ranges: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    trust: float,
    tolerance: float,
    known: NDArray[Any],
    evidence: NDArray[Any],
    seen: NDArray[Any],
    number: int,
    amount: int,
    cap: int,
    sensor: int,
    by: NDArray[Any],
    unseen: NDArray[Any],
    cells: NDArray[Any],
    count: int,
    field: NDArray[Any],
    disc: NDArray[Any],
) -> int:
    """Add the returns nearer than `trust` that the map does not explain; the new number of remembered cells.

    A return within `tolerance` plus 1 % of its range of a mapped cell is that cell. Each adds `amount`; `by` keeps
    which sensor it was, the lidar before the sweep. What is seen occupied is not `unseen`.
    """
    columns = field.shape[1]
    for beam in range(ranges.shape[0]):
        reach = ranges[beam]
        if reach > trust:
            continue
        angle = first + beam * step
        hit_x, hit_y = x + reach * math.cos(angle), y + reach * math.sin(angle)
        if value_at(known, hit_x, hit_y) <= tolerance + 0.01 * reach:
            continue
        row, column = int(hit_y * CELLS_PER_M), int(hit_x * CELLS_PER_M)
        if seen[row, column] == number:
            continue
        seen[row, column] = number
        if evidence[row, column] == 0:
            if count == cells.shape[0]:
                continue
            cells[count] = row * columns + column
            count += 1
            by[row, column] = sensor
            unseen[row, column] = 0
            paint(field, disc, row, column)
        by[row, column] = min(by[row, column], sensor)
        evidence[row, column] = min(evidence[row, column] + amount, cap)
    return count


@kernel
def fade(
    ranges: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    reach: float,
    evidence: NDArray[Any],
    seen: NDArray[Any],
    number: int,
    amount: int,
    sensor: int,
    by: NDArray[Any],
    cells: NDArray[Any],
    count: int,
    lost: NDArray[Any],
    gone: int,
) -> tuple[int, int]:
    """Take `amount` of evidence from the cells that this scan saw through; the new number of remembered cells.

    What was only glimpsed goes by itself: hit too few times to be `CONFIRMED`, and not for `GLIMPSE` looks now.
    Those forgotten are added to `lost`, of which `gone` are in use; the second number returned is how many then are.
    The field still has to be made right (`repaint`). Where `lost` is full, no more are forgotten this time.
    """
    columns = evidence.shape[1]
    half = 0.5 * ranges.shape[0] * step
    narrow = half < 0.25 * math.pi
    middle_x, middle_y = math.cos(first + half - 0.5 * step), math.sin(first + half - 0.5 * step)
    index = 0
    while index < count and gone < lost.shape[0]:
        row = cells[index] // columns
        column = cells[index] - row * columns
        if narrow:  # a few columns of a sweep: most cells lie well beside them
            to_x, to_y = (column + 0.5) * CELL - x, (row + 0.5) * CELL - y
            along = to_x * middle_x + to_y * middle_y
            if along < 0.0 or along > reach or abs(to_x * middle_y - to_y * middle_x) > along:
                index += 1
                continue
        glimpsed = evidence[row, column] < CONFIRMED and number - seen[row, column] > GLIMPSE
        if glimpsed or (
            seen[row, column] != number
            and by[row, column] <= sensor
            and looked(ranges, x, y, first, step, (column + 0.5) * CELL, (row + 0.5) * CELL, reach) == PASSED
        ):
            evidence[row, column] = 0 if glimpsed else max(evidence[row, column] - amount, 0)
            if evidence[row, column] == 0:
                lost[gone] = cells[index]
                gone += 1
                count -= 1
                cells[index] = cells[count]
                continue
        index += 1
    return count, gone


@kernel
def reveal(
    ranges: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    reach: float,
    trust: float,
    unseen: NDArray[Any],
    hidden: NDArray[Any],
    count: int,
) -> int:
    """See anew what was cleared, the cells in `hidden`; the new number of those still unseen.

    A beam that comes back from beyond shows a cell to be free. Of beams that do not come back it takes as many as
    `unseen` says, nearer than `trust`: the lidar sees what is near, so nothing there sends nothing back.
    """
    columns = unseen.shape[1]
    index = 0
    while index < count:
        row, column = hidden[index] // columns, hidden[index] % columns
        if unseen[row, column] > 0:
            cell_x, cell_y = (column + 0.5) * CELL, (row + 0.5) * CELL
            told = looked(ranges, x, y, first, step, cell_x, cell_y, reach)
            if told == PASSED:
                unseen[row, column] = 0
            elif told == OPEN and (cell_x - x) ** 2 + (cell_y - y) ** 2 < trust * trust:
                unseen[row, column] -= 1
        if unseen[row, column] == 0:
            count -= 1
            hidden[index] = hidden[count]
            continue
        index += 1
    return count


@kernel
def forget(
    x: float,
    y: float,
    heading: float,
    radius: float,
    outline: NDArray[Any],
    known: NDArray[Any],
    evidence: NDArray[Any],
    cells: NDArray[Any],
    count: int,
    field: NDArray[Any],
    disc: NDArray[Any],
    lost: NDArray[Any],
) -> int:
    """Forget the cells within `radius` of a pose, or of these only those under an outline where it has corners.

    Those forgotten are listed in `lost`, which has room for all; returns how many they are.
    """
    columns = field.shape[1]
    gone = 0
    index = 0
    while index < count:
        row, column = cells[index] // columns, cells[index] % columns
        off_x, off_y = (column + 0.5) * CELL - x, (row + 0.5) * CELL - y
        hit = off_x * off_x + off_y * off_y <= radius * radius
        if hit and outline.shape[0] > 0:
            hit = gap(outline, x, y, heading, x + off_x, y + off_y) <= 0.0
        if hit:
            evidence[row, column] = 0
            lost[gone] = cells[index]
            gone += 1
            count -= 1
            cells[index] = cells[count]
            continue
        index += 1
    if gone:
        repaint(field, known, disc, cells, count, lost[:gone])
    return gone


@kernel
def near(x: float, y: float, radius: float, cells: NDArray[Any], count: int, columns: int, points: NDArray[Any]) -> int:
    """Fill `points` with the centers of remembered cells within `radius`, evenly thinned; how many were filled."""
    inside = 0
    for index in range(count):
        off_x = (cells[index] % columns + 0.5) * CELL - x
        off_y = (cells[index] // columns + 0.5) * CELL - y
        inside += off_x * off_x + off_y * off_y <= radius * radius
    most = points.shape[0]
    every = max(1, (inside + most - 1) // most)
    filled, met = 0, 0
    for index in range(count):
        off_x = (cells[index] % columns + 0.5) * CELL - x
        off_y = (cells[index] // columns + 0.5) * CELL - y
        if off_x * off_x + off_y * off_y <= radius * radius:
            if met % every == 0:
                points[filled, 0], points[filled, 1] = x + off_x, y + off_y
                filled += 1
            met += 1
    return filled
