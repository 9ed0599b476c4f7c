"""The map as localization needs it: how far everything is from the nearest surface, and what a beam is worth there."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.sim.kernels.particles import TABLE_STEP_M, likelihood, survey
from runner.site.floor import clearance
from runner.site.values import CELL_M, Lidar

HIT, RANDOM, SIGMA_M = 0.8, 0.2, 0.08
"""Shares of beams that end at a mapped surface and anywhere, and how far off the former are (chosen)."""
WIDE_M = 0.3
"""The same, where spots and directions are looked at that lie apart."""
TABLE_M = 1.0
"""Beyond this a beam is worth no less."""
SPOTS_M = 0.2
"""Between two spots, and directions in a full turn, at which the robot may be, when it looks on the whole map."""
HEADINGS = 40
NEAR_WALL_M = 0.2
"""Nearer than this to a wall the robot does not fit."""
INDEPENDENT = 0.2
"""Share of the beams that count as independent there: spots that lie apart fit all of them a bit badly."""


@dataclass(frozen=True, slots=True)
class Field:
    """`signed`: meters to the nearest surface, negative within solids; `known`: to the nearest solid cell, 0 in it.

    `table` and `wide` are log-likelihoods of a beam by its distance in steps; `spots` (n, 2) where a robot may stand,
    `spread` the deviation of its position while it may be at any of them, meters.
    """

    known: NDArray[np.float32]
    signed: NDArray[np.float32]
    table: NDArray[np.float64]
    wide: NDArray[np.float64]
    spots: NDArray[np.float64]
    spread: float


def field_of(
    surfaces: NDArray[np.bool_], known: NDArray[np.float32], surveyed: NDArray[np.bool_], lidar: Lidar
) -> Field:
    """The field of a map; `surveyed` is its free floor, `known` the distance field of what stands for good.

    `surfaces` are all cells at which a beam may end: doors too, for they may be shut. Where only walls count, a shut
    door is taken for a wall, and the robot for a little farther on, where the wall goes on.
    """
    within, outside = clearance(np.pad(~surfaces, 1))[1:-1, 1:-1], clearance(surfaces)
    half = 0.5 * CELL_M
    signed = np.where(surfaces, half - within, outside - half).astype(np.float32)
    every = round(SPOTS_M / CELL_M)
    rows, columns = np.nonzero((surveyed & (known >= NEAR_WALL_M))[::every, ::every])
    spots = np.asarray((np.column_stack([columns, rows]) * every + 0.5) * CELL_M, dtype=np.float64)
    spread = math.sqrt(float(np.linalg.eigvalsh(np.cov(spots.T))[-1])) if len(spots) > 1 else 0.0
    return Field(known, signed, _table(SIGMA_M, lidar), _table(WIDE_M, lidar), spots, spread)


def find_on(field: Field, ends: NDArray[np.float64], count: int, generator: np.random.Generator) -> NDArray[np.float64]:
    """Poses (count, 3) anywhere on the map, drawn by how well the ends of beams fit there."""
    worth = np.empty((len(field.spots), HEADINGS))
    survey(field.spots, HEADINGS, ends, field.signed, field.wide, worth)
    share = np.exp(INDEPENDENT * (worth - worth.max())).ravel()
    chosen = np.searchsorted(np.cumsum(share), generator.random(count) * share.sum())
    spots, headings = np.divmod(np.minimum(chosen, share.size - 1), HEADINGS)
    poses = np.column_stack([field.spots[spots], 2.0 * math.pi / HEADINGS * headings])
    apart = np.array([SPOTS_M, SPOTS_M, 2.0 * math.pi / HEADINGS])
    return np.asarray(poses + apart * generator.uniform(-0.5, 0.5, poses.shape), dtype=np.float64)


def _table(sigma: float, lidar: Lidar) -> NDArray[np.float64]:
    count = round(TABLE_M / TABLE_STEP_M) + 1
    steps = [likelihood(step * TABLE_STEP_M, HIT, sigma, RANDOM, lidar.range_max) for step in range(count)]
    return np.log(np.array(steps, dtype=np.float64))
