"""How much of its route the robot sees, and what the columns of its sweep meet.

The route is seen as far as the disc that the robot covers there is: its middle and both its sides. A place is seen
where the beam that points at it runs at least as far.
"""

from __future__ import annotations

import math
from typing import Any

from numpy.typing import NDArray

from backends.sim.kernels import artefacts, grid, path, rays
from backends.sim.kernels.artefacts import met_person
from backends.sim.kernels.grid import bearing_of, value_at
from backends.sim.kernels.path import point_at
from backends.sim.kernels.rays import cast
from runner.site.compiled import kernel_compiler

kernel = kernel_compiler(__file__, grid.__file__, rays.__file__, path.__file__, artefacts.__file__)

TURN = 2.0 * math.pi
STEP_M = 0.1  # between two places on the route that are looked at
SHORT_M = 0.1  # a beam may fall so much short of a place that it shows: noise, and the width of a cell
FLOOR_M = 1.0  # a column that meets only floor reads so much more than its range


@kernel
def is_seen(
    sight: NDArray[Any], x: float, y: float, first: float, step: float, at_x: float, at_y: float, beside: bool
) -> bool:
    """Whether the beam that points at a place runs at least as far, or the one beside the robot's own post there.

    `beside` is the answer where no beam points.
    """
    to_x, to_y = at_x - x, at_y - y
    bearing = bearing_of(to_y, to_x) - first
    bearing -= math.floor(bearing / TURN) * TURN
    beam = int(bearing / step + 0.5)
    if beam >= sight.shape[0]:
        if TURN - bearing > 0.5 * step:
            return beside
        beam = 0
    return bool(math.sqrt(to_x * to_x + to_y * to_y) <= abs(sight[beam]) + SHORT_M)


@kernel
def seen_length(
    points: NDArray[Any],
    along: NDArray[Any],
    covered: float,
    most: float,
    sight: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    half: float,
    berth: float,
    here_x: float,
    here_y: float,
    known: NDArray[Any],
    unseen: NDArray[Any],
) -> tuple[float, float]:
    """How far from `covered` on, at most `most`, the route is seen now, and how far it leads through no unseen cell.

    `half` is the radius of the disc, `berth` how far beside it, up to the next wall of the map, the floor must be in
    sight as well. Where the robot stands, at `here`, nothing need be seen, nor what is beside it and out of the field
    of view. (x, y, first, step) are those of the scan that `sight` belongs to.
    """
    length = 0.0
    seen, free = -1.0, -1.0
    from_x, from_y = point_at(points, along, covered)
    while length < most and covered + length < along[-1] and (seen < 0.0 or free < 0.0):
        length += STEP_M
        to_x, to_y = point_at(points, along, covered + length)
        size = max(math.sqrt((to_x - from_x) ** 2 + (to_y - from_y) ** 2), 1e-9)
        left_x, left_y = (from_y - to_y) / size, (to_x - from_x) / size
        for side in range(-1, 2, 2):
            for place in range(4):
                off = side * (0.0, half, half + 0.5 * berth, half + berth)[place]
                at_x, at_y = to_x + off * left_x, to_y + off * left_y
                if value_at(known, at_x, at_y) <= SHORT_M:
                    break
                if place < 2 and free < 0.0 and value_at(unseen, at_x, at_y) > 0.0:
                    free = length - STEP_M
                away = math.sqrt((at_x - here_x) ** 2 + (at_y - here_y) ** 2)
                if seen >= 0.0 or away <= half + STEP_M:
                    continue
                if not is_seen(sight, x, y, first, step, at_x, at_y, away <= half + berth + STEP_M):
                    seen = length - STEP_M
        from_x, from_y = to_x, to_y
    return most if seen < 0.0 else seen, most if free < 0.0 else free


@kernel
def columns(
    distance: NDArray[Any],
    people: NDArray[Any],
    x: float,
    y: float,
    first: float,
    step: float,
    reach: float,
    noise: float,
    drawn: NDArray[Any],
    ranges: NDArray[Any],
) -> None:
    """Fill `ranges` with what columns from the floor upward meet; where that is only floor, with more than `reach`.

    `drawn` holds a standard normal number for each.
    """
    for column in range(ranges.shape[0]):
        angle = first + column * step
        along_x, along_y = math.cos(angle), math.sin(angle)
        met = cast(distance, x, y, along_x, along_y, reach)
        for index in range(people.shape[0]):
            met = min(met, met_person(people[index], x, y, along_x, along_y))
        met += noise * drawn[column]
        ranges[column] = max(met, 0.0) if met <= reach else reach + FLOOR_M
