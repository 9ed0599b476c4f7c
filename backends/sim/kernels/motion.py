"""Exact motion along an arc (Thrun, Burgard and Fox, Probabilistic Robotics, 2005, table 5.3 without its noise)."""

from __future__ import annotations

import math

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)

QUARTER = 0.5 * math.pi
STRAIGHT = 1e-6  # rad/s: below this the arc is driven as its chord, which differs by less than a nanometer


@kernel
def arc(x: float, y: float, heading: float, speed: float, turn: float, time: float) -> tuple[float, float, float]:
    """Where a robot at (x, y, heading) is after `time` at constant speed and turn rate; the heading not wrapped."""
    after = heading + turn * time
    if abs(turn) < STRAIGHT:
        middle = heading + 0.5 * turn * time
        return x + speed * time * math.cos(middle), y + speed * time * math.sin(middle), after
    radius = speed / turn
    return (
        x + radius * (math.sin(after) - math.sin(heading)),
        y + radius * (math.cos(heading) - math.cos(after)),
        after,
    )


@kernel
def glide(
    x: float, y: float, heading: float, speed: float, side: float, turn: float, time: float
) -> tuple[float, float, float]:
    """The same for a robot that also goes sideways, to the left at `side`: both ways are linear in their speeds."""
    ahead_x, ahead_y, after = arc(x, y, heading, speed, turn, time)
    if side == 0.0:
        return ahead_x, ahead_y, after
    left_x, left_y, _ = arc(0.0, 0.0, heading + QUARTER, side, turn, time)
    return ahead_x + left_x, ahead_y + left_y, after


@kernel
def wrapped(angle: float) -> float:
    """The same direction within -pi to pi."""
    return float(math.atan2(math.sin(angle), math.cos(angle)))


@kernel
def admissible(distance: float, deceleration: float) -> float:
    """The fastest speed that can be stopped within `distance` (Fox, Burgard and Thrun, 1997, equation 3)."""
    return math.sqrt(2.0 * max(distance, 0.0) * deceleration)
