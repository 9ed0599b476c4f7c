"""Monte Carlo localization as arithmetic: moving, weighing and drawing poses, and looking for them on a whole map.

Rows of `poses` are (x, y, heading). Beams are compared with the map by a likelihood field (Thrun, Burgard and Fox,
Probabilistic Robotics, 2005, table 6.3): a beam that ends at a distance d from the nearest mapped surface is worth
hit N(d; 0, sigma) + random / reach. How many poses are needed is found while they are drawn (Fox, International Journal
of Robotics Research 22, 2003): enough for their spread over bins to be known well.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid, rays
from backends.sim.kernels.grid import CELLS_PER_M, value_at
from backends.sim.kernels.rays import cast
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__, rays.__file__)

TURN = 2.0 * math.pi
TABLE_STEP_M = 0.01  # between two entries of a table of log-likelihoods by distance
BIN_M, BIN_TURN = 0.1, math.radians(5.0)  # sides of the bins that are counted
BINS = 1 << 14  # room for bins in use; more than the poses there ever are
GOLDEN = 0.6180339887498949  # multiples of it, without their whole part, lie evenly however many there are
LONGER_M = 0.4  # a beam that runs so much farther than the map allows has gone through a wall
MATCH_M = 0.3  # a beam that ends this near to a mapped surface is the map's
SLIPS_FROM = 1.2816  # deviations: one normal number in ten is above
SLIP_COUNTS = math.log(0.1)
EMPTY = -(1 << 62)


@kernel
def likelihood(distance: float, hit: float, sigma: float, random: float, reach: float) -> float:
    """What a beam is worth that ends at a distance from the nearest surface, per meter (table 6.3)."""
    share = distance / sigma
    return hit * math.exp(-0.5 * share * share) / (sigma * math.sqrt(TURN)) + random / reach


@kernel
def enough(bins: int, error: float, quantile: float) -> float:
    """How many draws keep the distance (Kullback-Leibler) to the true spread over so many bins within `error`.

    `quantile`: that of the normal distribution for the probability with which it does (Fox, 2003, equation 7).
    """
    if bins < 2:
        return 0.0
    free = float(bins - 1)
    part = 2.0 / (9.0 * free)
    root = 1.0 - part + math.sqrt(part) * quantile
    return free / (2.0 * error) * root * root * root


@kernel
def move(
    poses: NDArray[Any],
    ahead: float,
    left: float,
    turned: float,
    way: float,
    turn: float,
    last: float,
    drawn: NDArray[Any],
    weights: NDArray[Any],
) -> None:
    """Move every pose by what odometry says (as seen from where it was), each with errors of its own.

    `way`, `turn` and `last` are deviations: of the way made, of the turn on it, of a turn on the spot at its end.
    One in ten is moved as if the wheels had slipped and the robot had made less of the way, or none. So many are tried
    that slip is found; as it is rarer, they count for less, by what `weights` is filled with (a logarithm, for
    `weigh`). `drawn` has standard normal rows of four.
    """
    length = math.sqrt(ahead * ahead + left * left)
    for one in range(poses.shape[0]):
        grip = 1.0 - min(max(drawn[one, 3] - SLIPS_FROM, 0.0), 1.0)
        weights[one] = 0.0 if grip == 1.0 else SLIP_COUNTS
        longer = grip + way * drawn[one, 0] / length if length > 0.0 else 1.0
        veer = turn * drawn[one, 1]
        direction = poses[one, 2] + 0.5 * veer
        cosine, sine = math.cos(direction), math.sin(direction)
        poses[one, 0] += longer * (ahead * cosine - left * sine)
        poses[one, 1] += longer * (ahead * sine + left * cosine)
        poses[one, 2] += grip * turned + veer + last * drawn[one, 2]


@kernel
def ends_of(
    ranges: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    offset: int,
    every: int,
    reach: float,
    ends: NDArray[Any],
) -> int:
    """Where every so many beams ended, as seen from the robot: rows of `ends`; how many came back within `reach`.

    (x, y) is where the lidar was, `first` the direction of beam 0, both as seen from the robot now.
    """
    filled = 0
    for beam in range(offset, ranges.shape[0], every):
        if ranges[beam] < reach and filled < ends.shape[0]:
            angle = first + beam * step
            ends[filled, 0], ends[filled, 1] = x + ranges[beam] * math.cos(angle), y + ranges[beam] * math.sin(angle)
            filled += 1
    return filled


@kernel
def off_surface(signed: NDArray[Any], x: float, y: float) -> float:
    """Distance to the nearest mapped surface, from a raster of it (negative within solids), between cell centers."""
    column, row = x * CELLS_PER_M - 0.5, y * CELLS_PER_M - 0.5
    if column < 0.0 or row < 0.0 or column >= signed.shape[1] - 1 or row >= signed.shape[0] - 1:
        return np.inf
    c, r = int(column), int(row)
    right, up = column - c, row - r
    low = (1.0 - right) * signed[r, c] + right * signed[r, c + 1]
    high = (1.0 - right) * signed[r + 1, c] + right * signed[r + 1, c + 1]
    return float(abs((1.0 - up) * low + up * high))


@kernel
def weigh(
    poses: NDArray[Any],
    ends: NDArray[Any],
    signed: NDArray[Any],
    table: NDArray[Any],
    trust: float,
    weights: NDArray[Any],
) -> None:
    """Fill `weights`, adding up to 1, with how well the ends of beams fit the map from each pose.

    Before, they are the logarithms of what each pose was worth without the beams.

    `table` holds log-likelihoods by distance; `trust` is how many independent beams the beams are worth, as a share.
    """
    best = -np.inf
    last = table.shape[0] - 1
    for one in range(poses.shape[0]):
        x, y, heading = poses[one, 0], poses[one, 1], poses[one, 2]
        cosine, sine = math.cos(heading), math.sin(heading)
        total = 0.0
        for beam in range(ends.shape[0]):
            ahead, left = ends[beam, 0], ends[beam, 1]
            off = off_surface(signed, x + ahead * cosine - left * sine, y + ahead * sine + left * cosine)
            total += table[min(int(min(off, 100.0) / TABLE_STEP_M + 0.5), last)]
        weights[one] += trust * total
        best = max(best, weights[one])
    everything = 0.0
    for one in range(poses.shape[0]):
        weights[one] = math.exp(weights[one] - best)
        everything += weights[one]
    for one in range(poses.shape[0]):
        weights[one] /= everything


@kernel
def draw(
    poses: NDArray[Any],
    weights: NDArray[Any],
    start: float,
    fewest: int,
    error: float,
    quantile: float,
    blur: float,
    blur_turn: float,
    drawn: NDArray[Any],
    fresh: NDArray[Any],
    bins: NDArray[Any],
) -> int:
    """Draw poses by weight into `fresh` until there are enough of them, and blur each a little; how many there are.

    Evenly spread over the weights, as in low-variance drawing, by multiples of the golden section from `start` on.
    `bins` (BINS) are `EMPTY` before and after.
    """
    cumulated = np.cumsum(weights)
    in_use = np.empty(fresh.shape[0], dtype=np.int64)
    used, filled, needed = 0, 0, float(fewest)
    place = start
    while filled < fresh.shape[0] and filled < needed:
        place += GOLDEN
        place -= math.floor(place)
        one = min(np.searchsorted(cumulated, place * cumulated[-1]), poses.shape[0] - 1)
        x = poses[one, 0] + blur * drawn[filled, 0]
        y = poses[one, 1] + blur * drawn[filled, 1]
        heading = poses[one, 2] + blur_turn * drawn[filled, 2]
        fresh[filled, 0], fresh[filled, 1], fresh[filled, 2] = x, y, heading
        filled += 1
        turned = heading - math.floor(heading / TURN) * TURN
        key = (int(x / BIN_M) * 16384 + int(y / BIN_M)) * 128 + int(turned / BIN_TURN)
        slot = (key * 2654435761) & (BINS - 1)
        while bins[slot] != EMPTY and bins[slot] != key:
            slot = (slot + 1) & (BINS - 1)
        if bins[slot] == EMPTY:
            bins[slot] = key
            in_use[used] = slot
            used += 1
            needed = max(float(fewest), enough(used, error, quantile))
    for index in range(used):
        bins[in_use[index]] = EMPTY
    return filled


@kernel
def summary(poses: NDArray[Any], covariance: NDArray[Any]) -> tuple[float, float, float]:
    """The mean pose; `covariance` (3, 3) is filled with how the poses spread about it."""
    count = poses.shape[0]
    x, y, cosine, sine = 0.0, 0.0, 0.0, 0.0
    for one in range(count):
        x += poses[one, 0]
        y += poses[one, 1]
        cosine += math.cos(poses[one, 2])
        sine += math.sin(poses[one, 2])
    x, y, heading = x / count, y / count, math.atan2(sine, cosine)
    for i in range(3):
        for j in range(3):
            covariance[i, j] = 0.0
    for one in range(count):
        turned = poses[one, 2] - heading
        turned -= math.floor(turned / TURN + 0.5) * TURN
        off = (poses[one, 0] - x, poses[one, 1] - y, turned)
        for i in range(3):
            for j in range(3):
                covariance[i, j] += off[i] * off[j] / count
    return x, y, heading


@kernel
def against_map(
    known: NDArray[Any],
    x: float,
    y: float,
    heading: float,
    eye_x: float,
    eye_y: float,
    ends: NDArray[Any],
) -> tuple[int, int]:
    """Of every other beam with these ends: how many went through a mapped wall, and how many end at a mapped surface.

    The robot is taken to be at (x, y, heading); its lidar at (eye_x, eye_y) and the ends as seen from it.
    """
    cosine, sine = math.cos(heading), math.sin(heading)
    from_x, from_y = x + eye_x * cosine - eye_y * sine, y + eye_x * sine + eye_y * cosine
    longer, matching = 0, 0
    for beam in range(0, ends.shape[0], 2):
        end_x = x + ends[beam, 0] * cosine - ends[beam, 1] * sine
        end_y = y + ends[beam, 0] * sine + ends[beam, 1] * cosine
        way_x, way_y = end_x - from_x, end_y - from_y
        length = math.sqrt(way_x * way_x + way_y * way_y)
        if length <= 0.0:
            continue
        if cast(known, from_x, from_y, way_x / length, way_y / length, length) < length - LONGER_M:
            longer += 1
        elif value_at(known, end_x, end_y) <= MATCH_M:
            matching += 1
    return longer, matching


@kernel
def survey(
    spots: NDArray[Any],
    headings: int,
    ends: NDArray[Any],
    signed: NDArray[Any],
    table: NDArray[Any],
    worth: NDArray[Any],
) -> None:
    """How well the ends of beams fit the map from each spot (rows x, y) in each of so many directions.

    Fills `worth` (spots, headings) with sums of log-likelihoods (grid localization, Probabilistic Robotics, ch. 8.2).
    """
    last = table.shape[0] - 1
    rows, columns = signed.shape
    for turn in range(headings):
        angle = TURN * turn / headings
        cosine, sine = math.cos(angle), math.sin(angle)
        for spot in range(spots.shape[0]):
            total = 0.0
            for beam in range(ends.shape[0]):
                column = (spots[spot, 0] + ends[beam, 0] * cosine - ends[beam, 1] * sine) * CELLS_PER_M
                row = (spots[spot, 1] + ends[beam, 0] * sine + ends[beam, 1] * cosine) * CELLS_PER_M
                index = last
                if 0.0 <= row < rows and 0.0 <= column < columns:
                    index = min(int(abs(signed[int(row), int(column)]) / TABLE_STEP_M + 0.5), last)
                total += table[index]
            worth[spot, turn] = total
