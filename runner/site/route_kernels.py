"""The search over a weighted grid, compiled.

A* with a bucket queue: cells wait in stacks by their estimate (cost so far plus the least cost still to come), each
stack a fixed width of estimates, the stacks used in a ring (Dial, 1969, for the buckets). Inside a stack the order is
not by cost, so a cell may be expanded again when a cheaper way to it turns up; the search ends only when every
estimate still waiting is above the goal's cost. The cost is therefore exactly the least, whatever the width.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)

ROOT_2 = 2.0**0.5
RING_MOST = 1 << 16  # stacks in the ring; the width of a stack grows where weights would need more
NOWHERE = -1


@kernel
def search(  # noqa: C901, PLR0912, PLR0915, PLR0917
    weight: NDArray[Any], start_row: int, start_column: int, goal_row: int, goal_column: int, least: float
) -> tuple[NDArray[np.intp], float]:
    """Cells of the cheapest route, shape (n, 2), and its cost; no cells where there is none.

    `weight` (rows, columns) is positive, infinite where blocked; `least` is its least value.
    """
    rows, columns = weight.shape
    across = columns + 2  # a blocked border one cell wide spares every bounds check
    size = (rows + 2) * across
    price = np.full(size, np.inf)
    most = least
    for row in range(rows):
        for column in range(columns):
            value = weight[row, column]
            price[(row + 1) * across + column + 1] = value
            if value > most and value < np.inf:
                most = value
    step = np.array([1, -1, across, -across, across + 1, across - 1, 1 - across, -1 - across])
    beside = np.array([0, 0, 0, 0, 1, -1, 1, -1])  # the column part of a diagonal step
    start = (start_row + 1) * across + start_column + 1
    goal = (goal_row + 1) * across + goal_column + 1

    cost = np.full(size, np.inf)
    came = np.full(size, np.int8(NOWHERE))  # index of the step that led here
    waiting = np.zeros(size, dtype=np.bool_)

    width = max(0.5 * least, 2.0 * ROOT_2 * most / (RING_MOST - 2))
    ring = 2
    while ring * width < 2.0 * ROOT_2 * most + 2.0 * width:
        ring *= 2
    head = np.full(ring, NOWHERE, dtype=np.int32)
    entry_cell = np.empty(4096, dtype=np.int32)
    entry_next = np.empty(4096, dtype=np.int32)
    used = 0
    spare = NOWHERE
    count = 0

    diagonal_saving = (2.0 - ROOT_2) * least
    far_rows = abs(start_row - goal_row)
    far_columns = abs(start_column - goal_column)
    first = least * (far_rows + far_columns) - diagonal_saving * min(far_rows, far_columns)
    cost[start] = 0.0
    waiting[start] = True
    bucket = int(first / width)
    entry_cell[0] = start
    entry_next[0] = NOWHERE
    head[bucket & (ring - 1)] = 0
    used = 1
    count = 1
    while count > 0:
        if cost[goal] < bucket * width:
            break
        place = bucket & (ring - 1)
        entry = head[place]
        if entry == NOWHERE:
            bucket += 1
            continue
        head[place] = entry_next[entry]
        entry_next[entry] = spare
        spare = entry
        count -= 1
        cell = entry_cell[entry]
        if not waiting[cell]:
            continue
        waiting[cell] = False
        here = cost[cell]
        half = 0.5 * price[cell]
        for index in range(8):
            near = cell + step[index]
            toll = price[near]
            if toll == np.inf:
                continue
            if index < 4:
                reached = here + (half + 0.5 * toll)
            else:
                if price[cell + beside[index]] == np.inf or price[near - beside[index]] == np.inf:
                    continue
                reached = here + ROOT_2 * (half + 0.5 * toll)
            if reached >= cost[near]:
                continue
            cost[near] = reached
            came[near] = index
            waiting[near] = True
            far_rows = abs(near // across - 1 - goal_row)
            far_columns = abs(near % across - 1 - goal_column)
            estimate = reached + least * (far_rows + far_columns) - diagonal_saving * min(far_rows, far_columns)
            place = max(int(estimate / width), bucket) & (ring - 1)
            if spare != NOWHERE:
                entry = spare
                spare = entry_next[entry]
            else:
                if used == len(entry_cell):
                    entry_cell = np.append(entry_cell, np.empty(used, dtype=np.int32))
                    entry_next = np.append(entry_next, np.empty(used, dtype=np.int32))
                entry = used
                used += 1
            entry_cell[entry] = near
            entry_next[entry] = head[place]
            head[place] = entry
            count += 1

    if cost[goal] == np.inf:
        return np.empty((0, 2), dtype=np.intp), np.inf
    length = 1
    cell = goal
    while cell != start:
        cell -= step[came[cell]]
        length += 1
    cells = np.empty((length, 2), dtype=np.intp)
    cell = goal
    for index in range(length - 1, -1, -1):
        cells[index, 0] = cell // across - 1
        cells[index, 1] = cell % across - 1
        if index > 0:
            cell -= step[came[cell]]
    return cells, cost[goal]
