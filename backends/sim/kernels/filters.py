"""What the robot takes out of a scan before it believes it. Each filter is for one of the artefacts in `artefacts`."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__)

FLAT = math.tan(math.radians(10.0))  # a line between two neighboring returns flatter to the beam than this is a mixture
SLANTED = math.tan(math.radians(30.0))  # flatter than this it is one unless it is part of a wall
STRAIGHT_M = 0.15  # how far off the line of a wall a return may lie
FLOOR_MARGIN = math.radians(0.5)  # of the angle to the floor: what the inertial sensor may be wrong by, and more


@kernel
def drop_body(raw: NDArray[Any], body: NDArray[Any], ranges: NDArray[Any]) -> None:
    """Drop what lies nearer than `body`: how far each beam runs over the robot itself, and a little more."""
    for beam in range(raw.shape[0]):
        if raw[beam] < body[beam]:
            ranges[beam] = np.inf


@kernel
def continues(before: float, here: float, after: float) -> bool:
    """Whether three neighboring ranges lie on one straight wall, where 1 / range is linear."""
    expected = 2.0 / here - 1.0 / before
    return bool(before < np.inf and expected > 0.0 and abs(1.0 / expected - after) <= STRAIGHT_M)


@kernel
def drop_shadows(raw: NDArray[Any], body: NDArray[Any], step: float, ranges: NDArray[Any]) -> None:
    """Of two neighboring returns on a line that is flat to the beam, drop the farther: a mixture, or beside one.

    A line that is less flat is spared where a wall continues it to one side. The nearer return stays, so nothing that
    really stands there is lost. Returns from the robot itself are left out of it.
    """
    sine, cosine = math.sin(step), math.cos(step)
    count = raw.shape[0]
    for beam in range(count - 1):
        one, other = raw[beam], raw[beam + 1]
        near, far = min(one, other), max(one, other)
        if far == np.inf or one < body[beam] or other < body[beam + 1]:
            continue
        across, along = near * sine, far * cosine - near
        if across >= SLANTED * along:
            continue
        if across >= FLAT * along:
            before = raw[beam - 1] if beam > 0 else np.inf
            after = raw[beam + 2] if beam + 2 < count else np.inf
            if continues(before, one, other) or continues(after, other, one):
                continue
        ranges[beam if one > other else beam + 1] = np.inf


@kernel
def drop_floor(raw: NDArray[Any], ahead: NDArray[Any], height: float, nod: float, ranges: NDArray[Any]) -> None:
    """Drop what lies where the beams meet the floor, or beyond, with the nose as far down as the robot measures."""
    for beam in range(raw.shape[0]):
        fall = nod * ahead[beam] + FLOOR_MARGIN
        if fall > 0.0 and raw[beam] < np.inf and raw[beam] * fall > height:
            ranges[beam] = np.inf


@kernel
def sight_of(raw: NDArray[Any], body: NDArray[Any], sight: NDArray[Any]) -> int:
    """How far each beam saw, infinite where nothing stopped it; the number of returns.

    Beams that end at the robot itself say, negative, how far the one beside them saw.
    """
    returns = 0
    last = np.inf
    for beam in range(raw.shape[0]):
        returns += raw[beam] < np.inf
        if raw[beam] < body[beam]:
            sight[beam] = -last
            continue
        last = raw[beam]
        sight[beam] = last
    return returns
