"""Where somebody puts the robot who carries it: as near to where it was meant to go as it fits."""

from __future__ import annotations

import math

import numpy as np

from backends.sim.kernels.overlap import covers_solid, gap
from backends.sim.outline import Outline
from backends.sim.world import World
from runner.site.values import Pose, Site

TRIES = 200
WIDER_M = 0.02
"""Each try is allowed to be so much farther off."""
NEAR_A_PLACE_M = 1.5
"""Carried to anywhere, it is put down within this of a place of the site."""


def spot_for(
    to: Pose | None,
    site: Site,
    world: World,
    people: np.ndarray[tuple[int, ...], np.dtype[np.float64]],
    outline: Outline,
    generator: np.random.Generator,
) -> Pose | None:
    """A pose where the robot stands free, near `to` or near any place; None where there is no room.

    `people` has rows (x, y, radius).
    """
    off = 0.0
    for _ in range(TRIES):
        wanted = to
        if wanted is None:
            pose = site.places[int(generator.integers(len(site.places)))].pose
            wanted = Pose(pose.x, pose.y, float(generator.uniform(0.0, 2.0 * math.pi)))
        away = off if to is not None else NEAR_A_PLACE_M
        off += WIDER_M
        x, y = (float(value) for value in np.array([wanted.x, wanted.y]) + away * generator.uniform(-1.0, 1.0, 2))
        if covers_solid(world.blocked, outline.hull, x, y, wanted.heading):
            continue
        if all(gap(outline.hull, x, y, wanted.heading, person[0], person[1]) > person[2] for person in people):
            return Pose(x, y, wanted.heading)
    return None
