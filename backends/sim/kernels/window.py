"""The dynamic window (Fox, Burgard and Thrun, 1997) along a route, with the full outline of the robot.

Candidates are the speeds, ahead and sideways, and turn rates that the drive can reach within a short while. Each is
rolled out as an arc; it is admissible where the robot could stop before its outline comes too near to anything. Of the
admissible ones the best makes most way along the route, stays near it, points along it and keeps off obstacles.

The outline is given as `rim`, points on it with the distance to the next, shape (n, 3), robot frame. `field` is
the believed distance to the nearest obstacle (see `evidence`).
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid, motion, path
from backends.sim.kernels.grid import value_at
from backends.sim.kernels.motion import admissible
from backends.sim.kernels.path import point_at, project
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__, motion.__file__, path.__file__)

CELL_DIAGONAL = 0.0708
STEP_S = 0.1  # time between two checks on an arc
TOUCHING_M = 0.07  # with an obstacle's cell nearer to the rim than this, only driving backward is allowed
REACTION_S = 0.1  # one tick passes before a change of mind takes effect
SPEEDS, SIDES, TURNS = 7, 5, 21  # candidates; one of `SIDES` for a drive that cannot go sideways
WEIGHT_OFF = 1.2  # per meter beside the route, against 1 per meter along it
WEIGHT_NEAR = 0.5  # meters, for touching, falling to none at `ROOMY_M` of clearance beyond the inscribed radius
ROOMY_M = 0.25
POINT_AHEAD_M = 0.3  # where on the route its direction is taken


@kernel
def closeness(
    field: NDArray[Any], rim: NDArray[Any], x: float, y: float, cosine: float, sine: float, enough: float
) -> float:
    """The least clearance of the outline, turned by an angle given as cosine and sine, as far as it is below `enough`.

    `rim` has rows (x, y, distance to the next). Points so near to one with much clearance that they cannot have too
    little are not looked at.
    """
    least = enough
    spare = 0.0
    for index in range(rim.shape[0]):
        if spare > 0.0:
            spare -= rim[index, 2]
            continue
        ahead, left = rim[index, 0], rim[index, 1]
        free = value_at(field, x + ahead * cosine - left * sine, y + ahead * sine + left * cosine)
        least = min(least, free)
        spare = free - enough - CELL_DIAGONAL - rim[index, 2]
    return least


@kernel
def fits(
    field: NDArray[Any],
    rim: NDArray[Any],
    inner: float,
    outer: float,
    x: float,
    y: float,
    cosine: float,
    sine: float,
    need: float,
) -> bool:
    """Whether the outline at a pose has everywhere at least the clearance `need`.

    `inner` and `outer` are the inscribed and circumscribed radius, which mostly settle it.
    """
    center = value_at(field, x, y)
    if center >= outer + need + CELL_DIAGONAL:
        return True
    if center < inner:
        return False
    return bool(closeness(field, rim, x, y, cosine, sine, need) >= need)


@kernel
def free_turn(
    field: NDArray[Any],
    rim: NDArray[Any],
    inner: float,
    outer: float,
    x: float,
    y: float,
    heading: float,
    by: float,
    margin: float,
) -> float:
    """How much of a turn in place by the angle `by` is free, at least 0, at most abs(by)."""
    need = max(closeness(field, rim, x, y, math.cos(heading), math.sin(heading), margin), TOUCHING_M)
    steps = max(1, math.ceil(abs(by) / 0.07))
    for step in range(1, steps + 1):
        angle = heading + by * step / steps
        if not fits(field, rim, inner, outer, x, y, math.cos(angle), math.sin(angle), need):
            return abs(by) * (step - 1) / steps
    return abs(by)


@kernel
def free_straight(
    field: NDArray[Any],
    rim: NDArray[Any],
    inner: float,
    outer: float,
    x: float,
    y: float,
    heading: float,
    by: float,
    margin: float,
) -> float:
    """How much of a straight drive by `by` (negative: backward) is free, at least 0, at most abs(by)."""
    cosine, sine = math.cos(heading), math.sin(heading)
    need = closeness(field, rim, x, y, cosine, sine, margin)
    steps = max(1, math.ceil(abs(by) / 0.03))
    for step in range(1, steps + 1):
        part = by * step / steps
        if not fits(field, rim, inner, outer, x + part * cosine, y + part * sine, cosine, sine, need):
            return abs(by) * (step - 1) / steps
    return abs(by)


@kernel
def unit_arc(heading: float, turn: float, rows: NDArray[Any]) -> None:
    """Where an arc at a speed of 1 m/s and a turn rate leads from the origin, every `STEP_S`: (x, y, cos, sin) a row.

    At another speed the way is as many times as long, and sideways it is turned by a quarter, so one rolling out serves
    all speeds. By rotation of the last step, exact up to rounding; row 0 is the start.
    """
    half = 0.5 * turn * STEP_S
    chord = STEP_S if abs(half) < 1e-9 else STEP_S * math.sin(half) / half
    cosine, sine = math.cos(heading + half), math.sin(heading + half)
    rotate_cosine, rotate_sine = math.cos(2.0 * half), math.sin(2.0 * half)
    half_cosine, half_sine = math.cos(half), math.sin(half)
    rows[0, 0], rows[0, 1], rows[0, 2], rows[0, 3] = 0.0, 0.0, math.cos(heading), math.sin(heading)
    for step in range(1, rows.shape[0]):
        rows[step, 0] = rows[step - 1, 0] + chord * cosine
        rows[step, 1] = rows[step - 1, 1] + chord * sine
        rows[step, 2] = cosine * half_cosine - sine * half_sine
        rows[step, 3] = sine * half_cosine + cosine * half_sine
        cosine, sine = cosine * rotate_cosine - sine * rotate_sine, sine * rotate_cosine + cosine * rotate_sine


@kernel
def choose(
    field: NDArray[Any],
    rim: NDArray[Any],
    inner: float,
    outer: float,
    margin: float,
    points: NDArray[Any],
    along: NDArray[Any],
    covered: float,
    x: float,
    y: float,
    heading: float,
    speed: float,
    side: float,
    turn: float,
    fastest: float,
    acceleration: float,
    side_fastest: float,
    turn_fastest: float,
    turn_acceleration: float,
    window: float,
    horizon: float,
    pointing: float,
) -> tuple[float, float, float, float]:
    """The best admissible (speed, side, turn rate, score); score -inf and no motion where nothing is admissible.

    `covered` is how far along the route the robot is; `window` the time in which candidates must be reachable;
    `horizon` the time an arc is looked at; `pointing` what it costs to point off the route. A drive that cannot go
    sideways has a `side_fastest` of 0. From fast to slow: what cannot make as much way as the best did is not tried.
    """
    need = max(closeness(field, rim, x, y, math.cos(heading), math.sin(heading), margin), TOUCHING_M)
    low_speed = max(0.0, speed - acceleration * window)
    high_speed = max(min(fastest, speed + acceleration * window), low_speed)
    sides = SIDES if side_fastest > 0.0 else 1
    low_side = max(-min(side_fastest, fastest), side - acceleration * window)
    high_side = max(min(side_fastest, fastest, side + acceleration * window), low_side)
    low_turn = max(-turn_fastest, turn - turn_acceleration * window)
    high_turn = min(turn_fastest, turn + turn_acceleration * window)
    steps = int(horizon / STEP_S + 0.5)
    rates = np.empty(TURNS)
    ways = np.empty((TURNS, steps + 1, 4))
    for j in range(TURNS):
        rates[j] = low_turn + (high_turn - low_turn) * j / (TURNS - 1)
        unit_arc(heading, rates[j], ways[j])
    best_speed, best_side, best_turn, best = 0.0, 0.0, 0.0, -np.inf
    for i in range(SPEEDS - 1, -1, -1):
        v = low_speed + (high_speed - low_speed) * i / (SPEEDS - 1)
        for k in range(sides):
            s = low_side + (high_side - low_side) * k / max(sides - 1, 1)
            pace = math.sqrt(v * v + s * s)
            if pace * steps * STEP_S <= best or pace > fastest + 1e-9:
                continue
            for order in range(TURNS):
                j = TURNS // 2 + (order + 1) // 2 * (1 - 2 * (order % 2))
                w, way = rates[j], ways[j]
                free, clearance = rolled(field, rim, inner, outer, x, y, way, v, s, need)
                left = free * STEP_S - REACTION_S
                if pace > admissible(pace * left, acceleration) + 1e-9:
                    continue
                if abs(w) > admissible(abs(w) * left, turn_acceleration) + 1e-9:
                    continue
                score = worth(points, along, covered, x, y, way[free], v, s, pace * free * STEP_S, pointing)
                score -= WEIGHT_NEAR * max(0.0, 1.0 - (clearance - inner) / ROOMY_M)
                if score > best:
                    best_speed, best_side, best_turn, best = v, s, w, score
    return best_speed, best_side, best_turn, best


@kernel
def rolled(
    field: NDArray[Any],
    rim: NDArray[Any],
    inner: float,
    outer: float,
    x: float,
    y: float,
    way: NDArray[Any],
    speed: float,
    side: float,
    need: float,
) -> tuple[int, float]:
    """How many steps of the arc are free, and the least clearance of the turning center on those."""
    clearance = value_at(field, x, y)
    for step in range(1, way.shape[0]):
        at_x = x + speed * way[step, 0] - side * way[step, 1]
        at_y = y + speed * way[step, 1] + side * way[step, 0]
        if not fits(field, rim, inner, outer, at_x, at_y, way[step, 2], way[step, 3], need):
            return step - 1, clearance
        clearance = min(clearance, value_at(field, at_x, at_y))
    return way.shape[0] - 1, clearance


@kernel
def worth(
    points: NDArray[Any],
    along: NDArray[Any],
    covered: float,
    x: float,
    y: float,
    end: NDArray[Any],
    speed: float,
    side: float,
    length: float,
    pointing: float,
) -> float:
    """What driving an arc is worth: way made along the route, less what its end is off the route and points off it.

    `end` is the row of `unit_arc` where it ends, `length` how long it is.
    """
    end_x, end_y = x + speed * end[0] - side * end[1], y + speed * end[1] + side * end[0]
    reached, off = project(points, along, end_x, end_y, covered - 0.2, covered + length + 0.3)
    from_x, from_y = point_at(points, along, reached)
    to_x, to_y = point_at(points, along, reached + POINT_AHEAD_M)
    score = reached - covered - WEIGHT_OFF * off
    way_x, way_y = to_x - from_x, to_y - from_y
    size = math.sqrt(way_x * way_x + way_y * way_y)
    if size > 0.0:
        score -= pointing * (1.0 - (way_x * end[2] + way_y * end[3]) / size)
    return score
