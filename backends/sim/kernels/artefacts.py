"""What a lidar gets wrong by physics: mixtures at edges, the robot's own posts, the floor, beams that are lost.

Ranges come from `rays.scan`; these kernels spoil them in place. Angles of beam i: `first` + i * `step` on the floor.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels import grid, rays
from backends.sim.kernels.rays import cast, grazes
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__, rays.__file__)

LEAST_JUMP_M = 0.15  # between two neighboring ranges, and off the line that the beams before continue: an edge
MOST_JUMP_M = 3.0  # surfaces farther apart give two separate echoes, of which the first counts


@kernel
def met_person(person: NDArray[Any], x: float, y: float, along_x: float, along_y: float) -> float:
    """Range along a unit direction to a person, a row (x, y, radius), infinity where the ray passes by."""
    to_x, to_y, radius = person[0] - x, person[1] - y, person[2]
    along = to_x * along_x + to_y * along_y
    across = to_x * along_y - to_y * along_x
    if along <= 0.0 or abs(across) >= radius:
        return np.inf
    depth = math.sqrt(radius * radius - across * across)
    return float(max(along - depth, 0.0))


@kernel
def ray(distance: NDArray[Any], people: NDArray[Any], x: float, y: float, angle: float, reach: float) -> float:
    """Range of one ray among cells and people, exact; infinity where it is farther than `reach`."""
    along_x, along_y = math.cos(angle), math.sin(angle)
    met = cast(distance, x, y, along_x, along_y, reach)
    if met < np.inf and grazes(distance, x, y, along_x, along_y, met):
        met = np.inf
    for index in range(people.shape[0]):
        met = min(met, met_person(people[index], x, y, along_x, along_y))
    return met if met <= reach else np.inf


@kernel
def is_edge(before: float, here: float, after: float) -> bool:
    """Whether the range jumps from `here` to `after`, and not as on a wall seen flatly, where 1 / range is linear."""
    if not (here < np.inf and after < np.inf and abs(after - here) > LEAST_JUMP_M):
        return False
    expected = 2.0 / here - 1.0 / before
    return expected <= 0.0 or abs(1.0 / expected - after) > LEAST_JUMP_M


@kernel
def mix(
    distance: NDArray[Any],
    people: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    reach: float,
    width: float,
    drawn: NDArray[Any],
    ranges: NDArray[Any],
) -> None:
    """Where the light of a beam, `width` radians wide, falls on two surfaces, return something between the two.

    Only where neighboring ranges jump is it worth looking: there the rim of the beam is cast as a ray of its own.
    `drawn` holds an even number from 0 to 1 for each beam, which is where between the two it lies.
    """
    count = ranges.shape[0]
    farther, before = np.inf, np.inf
    for beam in range(count):
        here = ranges[beam]
        after = ranges[beam + 1] if beam + 1 < count else np.inf
        rim = 0.0
        if is_edge(before, here, after):
            rim = 0.5 * width
        elif is_edge(farther, before, here):
            rim = -0.5 * width
        if rim != 0.0:
            other = ray(distance, people, x, y, first + beam * step + rim, reach)
            if LEAST_JUMP_M < abs(other - here) <= MOST_JUMP_M:
                ranges[beam] = here + drawn[beam] * (other - here)
        farther, before = before, here


@kernel
def spoil(
    ranges: NDArray[Any],
    own: NDArray[Any],
    ahead: NDArray[Any],
    reach: float,
    noise: float,
    height: float,
    nod: float,
    dropouts: float,
    normal: NDArray[Any],
    even: NDArray[Any],
) -> None:
    """Put the robot's own posts and the floor before what the beams meet, and lose some of them.

    `own` is the range of the robot's own parts, infinite where there are none; `ahead` the cosine of each beam's angle
    to the robot's heading; `height` that of the lidar above the floor, and `nod` how far its nose is down, radians.
    `normal` and `even` hold random numbers for each beam, standard normal and from 0 to 1.
    """
    for beam in range(ranges.shape[0]):
        if own[beam] < ranges[beam]:
            ranges[beam] = max(own[beam] + noise * normal[beam], 0.0)
        fall = nod * ahead[beam]
        if height > 0.0 and fall > 0.0 and height < fall * min(ranges[beam], reach):
            ranges[beam] = max(height / fall + noise * normal[beam], 0.0)
        if even[beam] < dropouts:
            ranges[beam] = np.inf
