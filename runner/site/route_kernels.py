"""The search over a weighted grid, compiled.

A* with a bucket queue (buckets after Dial, 1969): cells wait in stacks by their estimate, which is the cost so far
plus a bound of the cost still to come; the stacks are used in a ring. A stack holds a narrow span of estimates in no
order, so a cell may be expanded again when a cheaper way to it turns up. The search ends only when every estimate
still waiting is above the goal's cost: the cost is the least there is, whatever the width of a stack.

Each cell waits at most once: stacks are doubly linked through two arrays, so nothing has to grow.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)

ROOT_2 = 2.0**0.5
NOBODY = -1  # end of a stack; -1 - p stands for the head of stack p
WAITING = 8  # beside the number of the step (0 to 7) that led to a cell

WIDTH = 0.003  # of a stack, in least weights: narrow enough that hardly a cell is expanded twice
RING_MOST = 1 << 16  # stacks in the ring: the width grows where weights span more than this holds
CAUTIOUS = 1.0 - 1e-6  # of a cost as a bound: it was summed in another order, and is kept in single precision
GAIN_LEAST = 1e-11  # of a cheaper way, in least weights: rounding alone is no reason to expand a cell again

# The eight steps, straight ones first.
ROW_STEPS = np.array([0, 0, 1, -1, 1, 1, -1, -1])
COLUMN_STEPS = np.array([1, -1, 0, 0, 1, -1, 1, -1])
STEP_LENGTHS = np.array([1.0, 1.0, 1.0, 1.0, ROOT_2, ROOT_2, ROOT_2, ROOT_2])


@kernel
def search(
    weight: NDArray[Any],
    start_row: int,
    start_column: int,
    goal_row: int,
    goal_column: int,
    ahead: NDArray[Any],
    least: float,
    most: float,
) -> tuple[NDArray[np.intp], float]:
    """Cells of the cheapest route, shape (n, 2), and its cost; no cells where there is none.

    `weight` (rows, columns) is positive, infinite where blocked; `least` and `most` bound its finite values. `ahead` is
    what `costs_to` gives for the goal on weights that are nowhere higher, or has no cells.
    """
    across = weight.shape[1] + 2
    start = (start_row + 1) * across + start_column + 1
    goal = (goal_row + 1) * across + goal_column + 1
    cost, state = explore(with_border(weight), across, start, goal, ahead, least, most)
    return traced(state, ROW_STEPS * across + COLUMN_STEPS, start, goal, across, cost[goal]), cost[goal]


@kernel
def costs_to(weight: NDArray[Any], row: int, column: int, least: float, most: float) -> NDArray[Any]:
    """The cost of the cheapest route from each cell to one, infinite where there is none: row by row, with a border."""
    across = weight.shape[1] + 2
    start = (row + 1) * across + column + 1
    price = with_border(weight)
    cost, _ = explore(price, across, start, 0, np.zeros(price.size, dtype=np.float32), least, most)
    ahead = np.empty(cost.size, dtype=np.float32)
    for cell in range(cost.size):
        ahead[cell] = cost[cell] * CAUTIOUS
    return ahead


@kernel
def explore(  # noqa: C901, PLR0912, PLR0915 - one loop over plain arrays: a call in it costs ten times the work
    price: NDArray[Any], across: int, start: int, goal: int, ahead: NDArray[Any], least: float, most: float
) -> tuple[NDArray[Any], NDArray[np.int8]]:
    """The least cost to each cell that the search came to, and by which step, until the goal's is known.

    `price` are weights with a border, cells counted in it row by row. The bound of the cost still to come is taken from
    `ahead`, and where that has no cells from the distance and the least weight. A goal in the border is never reached.
    """
    guided = ahead.size > 0
    steps = ROW_STEPS * across + COLUMN_STEPS
    goal_row, goal_column = goal // across - 1, goal % across - 1
    width, ring = ring_for(least, most)
    per_width = 1.0 / width
    gain = GAIN_LEAST * least
    saving = (2.0 - ROOT_2) * least  # of a diagonal step over two straight ones

    cost = np.full(price.size, np.inf)
    state = np.zeros(price.size, dtype=np.int8)
    after = np.empty(price.size, dtype=np.int32)
    before = np.empty(price.size, dtype=np.int32)
    heads = np.full(ring, NOBODY, dtype=np.int32)

    far_rows, far_columns = abs(start // across - 1 - goal_row), abs(start % across - 1 - goal_column)
    to_come = least * (far_rows + far_columns) - saving * min(far_rows, far_columns)
    if guided:
        to_come = ahead[start]
    if to_come == np.inf:
        return cost, state
    number = int(to_come * per_width)
    place = number & (ring - 1)
    cost[start], state[start] = 0.0, WAITING
    heads[place], after[start], before[start] = start, NOBODY, NOBODY - place
    count = 1
    while count > 0:
        place = number & (ring - 1)
        cell = heads[place]
        if cell < 0:
            number += 1
            if cost[goal] < number * width:
                break
            continue
        follower = after[cell]
        heads[place] = follower
        if follower >= 0:
            before[follower] = NOBODY - place
        count -= 1
        state[cell] -= WAITING

        here = cost[cell]
        half = 0.5 * price[cell]
        row = cell // across - 1
        column = cell % across - 1
        for index in range(8):
            near = cell + steps[index]
            toll = price[near]
            if toll == np.inf:
                continue
            aside = COLUMN_STEPS[index]
            if index >= 4 and (price[cell + aside] == np.inf or price[near - aside] == np.inf):
                continue
            reached = here + STEP_LENGTHS[index] * (half + 0.5 * toll)
            if reached >= cost[near] - gain:
                continue
            if state[near] >= WAITING:
                leader, follower = before[near], after[near]
                if leader >= 0:
                    after[leader] = follower
                else:
                    heads[NOBODY - leader] = follower
                if follower >= 0:
                    before[follower] = leader
            else:
                count += 1
            if guided:
                estimate = reached + ahead[near]
            else:
                far_rows = abs(row + ROW_STEPS[index] - goal_row)
                far_columns = abs(column + aside - goal_column)
                estimate = reached + (least * (far_rows + far_columns) - saving * min(far_rows, far_columns))
            place = max(int(estimate * per_width), number) & (ring - 1)
            follower = heads[place]
            cost[near], state[near] = reached, index + WAITING
            heads[place], after[near], before[near] = near, follower, NOBODY - place
            if follower >= 0:
                before[follower] = near
    return cost, state


@kernel
def joined(weight: NDArray[Any], start_row: int, start_column: int, goal_row: int, goal_column: int) -> bool:
    """Whether any route joins two open cells: by flooding from both in turn until one side is full or they meet."""
    across = weight.shape[1] + 2
    ends = (
        (start_row + 1) * across + start_column + 1,
        (goal_row + 1) * across + goal_column + 1,
    )
    if ends[0] == ends[1]:
        return True
    price = with_border(weight)
    side = np.zeros(price.size, dtype=np.int8)
    queue = np.empty((2, price.size), dtype=np.int32)
    done, filled = np.zeros(2, dtype=np.int64), np.ones(2, dtype=np.int64)
    for which in range(2):
        queue[which, 0] = ends[which]
        side[ends[which]] = which + 1
    while True:
        for which in range(2):
            if done[which] == filled[which]:
                return False
            cell = queue[which, done[which]]
            done[which] += 1
            for near in (cell + 1, cell - 1, cell + across, cell - across):
                if side[near] == which + 1 or price[near] == np.inf:
                    continue
                if side[near] != 0:
                    return True
                side[near] = which + 1
                queue[which, filled[which]] = near
                filled[which] += 1


@kernel
def with_border(weight: NDArray[Any]) -> NDArray[Any]:
    """The weights row by row with a blocked cell on every side, which spares each step its bounds check."""
    rows, columns = weight.shape
    across = columns + 2
    price = np.empty((rows + 2) * across, dtype=weight.dtype)
    for cell in range(across):  # loops, for assigning to slices takes four seconds more to compile
        price[cell] = np.inf
        price[price.size - 1 - cell] = np.inf
    for row in range(rows):
        first = (row + 1) * across
        price[first] = np.inf
        price[first + columns + 1] = np.inf
        for column in range(columns):
            price[first + 1 + column] = weight[row, column]
    return price


@kernel
def ring_for(least: float, most: float) -> tuple[float, int]:
    """Width and number (a power of two) of stacks, so that one step never reaches all around the ring."""
    reach = 2.0 * ROOT_2 * most  # a step costs at most half of it, and can raise the cost to come by as much
    width = max(WIDTH * least, reach / (RING_MOST - 4))
    ring = 4
    while ring * width < reach + 3.0 * width:
        ring *= 2
    return width, ring


@kernel
def traced(
    state: NDArray[np.int8], steps: NDArray[np.intp], start: int, goal: int, across: int, total: float
) -> NDArray[np.intp]:
    """The cells from start to goal, by going back the step that led to each; none where the goal was not reached."""
    if total == np.inf:
        return np.empty((0, 2), dtype=np.intp)
    length = 1
    cell = goal
    while cell != start:
        cell -= steps[state[cell] & 7]
        length += 1
    cells = np.empty((length, 2), dtype=np.intp)
    cell = goal
    for index in range(length - 1, -1, -1):
        cells[index, 0] = cell // across - 1
        cells[index, 1] = cell % across - 1
        cell -= 0 if index == 0 else steps[state[cell] & 7]
    return cells
