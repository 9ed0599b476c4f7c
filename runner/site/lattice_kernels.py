"""The flood over cells and headings, compiled (see `runner.site.lattice`)."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)

HEADINGS = 32
EVERY = np.uint32(0xFFFFFFFF)
ONE = np.uint32(1)
ROWS = np.array([0, 1, 1, 1, 0, -1, -1, -1])
COLUMNS = np.array([1, 1, 0, -1, -1, -1, 0, 1])
STAND, TURN = 0, 3  # motions of a heading, beside its two drives 1 and 2


@kernel
def is_free(
    counts: NDArray[Any], stretches: NDArray[Any], begins: NDArray[Any], motion: int, row: int, column: int
) -> bool:
    """Whether all that a motion covers, begun in a cell, lies on the floor and is not blocked.

    `counts[r, c]` is the number of blocked cells of row r before column c.
    """
    rows, columns = counts.shape[0], counts.shape[1] - 1
    for index in range(begins[motion], begins[motion + 1]):
        at = row + stretches[index, 0]
        first, after = column + stretches[index, 1], column + stretches[index, 2]
        if at < 0 or at >= rows or first < 0 or after > columns:
            return False
        if counts[at, after] != counts[at, first]:
            return False
    return True


@kernel
def flood(  # noqa: C901, PLR0912 - one loop over plain arrays
    counts: NDArray[Any],
    open_: NDArray[Any],
    possible: NDArray[Any],
    stretches: NDArray[Any],
    begins: NDArray[Any],
    ahead: NDArray[Any],
    seeds: NDArray[Any],
) -> NDArray[Any]:
    """The headings in which each cell can be come to, as bits. `open_` cells have room for every heading, cells that
    are not `possible` for none; `seeds` are rows (row, column, heading) at which the robot may begin, if free."""
    rows, columns = open_.shape
    seen = np.zeros((rows, columns), dtype=np.uint32)
    stack = np.empty(np.count_nonzero(possible) * HEADINGS + 1, dtype=np.int64)
    size = 0
    for seed in range(seeds.shape[0]):
        row, column, heading = seeds[seed, 0], seeds[seed, 1], seeds[seed, 2]
        if possible[row, column] and is_free(counts, stretches, begins, 4 * heading + STAND, row, column):
            size = _mark(seen, open_, stack, size, row, column, heading)
    while size > 0:
        size -= 1
        heading = stack[size] % HEADINGS
        cell = stack[size] // HEADINGS
        row, column = cell // columns, cell % columns
        first, last = (0, HEADINGS) if open_[row, column] else (heading, heading + 1)
        for facing in range(first, last):
            if not open_[row, column]:
                following, before = (facing + 1) % HEADINGS, (facing + HEADINGS - 1) % HEADINGS
                if not seen[row, column] >> np.uint32(following) & ONE and is_free(
                    counts, stretches, begins, 4 * facing + TURN, row, column
                ):
                    size = _mark(seen, open_, stack, size, row, column, following)
                if not seen[row, column] >> np.uint32(before) & ONE and is_free(
                    counts, stretches, begins, 4 * before + TURN, row, column
                ):
                    size = _mark(seen, open_, stack, size, row, column, before)
            for way in range(2):
                direction = ahead[facing, way]
                if direction < 0:
                    continue
                for sign in (1, -1):
                    to_row, to_column = row + sign * ROWS[direction], column + sign * COLUMNS[direction]
                    if to_row < 0 or to_column < 0 or to_row >= rows or to_column >= columns:
                        continue
                    if not possible[to_row, to_column] or seen[to_row, to_column] >> np.uint32(facing) & ONE:
                        continue
                    base_row, base_column = (row, column) if sign == 1 else (to_row, to_column)
                    if is_free(counts, stretches, begins, 4 * facing + 1 + way, base_row, base_column):
                        size = _mark(seen, open_, stack, size, to_row, to_column, facing)
    return seen


@kernel
def _mark(
    seen: NDArray[Any], open_: NDArray[Any], stack: NDArray[Any], size: int, row: int, column: int, heading: int
) -> int:
    """Note that a heading in a cell can be come to, or all of them where there is room, and go on from there later."""
    if open_[row, column]:
        if seen[row, column] == EVERY:
            return size
        seen[row, column] = EVERY
    else:
        seen[row, column] |= ONE << np.uint32(heading)
    stack[size] = (row * seen.shape[1] + column) * HEADINGS + heading
    return size + 1
