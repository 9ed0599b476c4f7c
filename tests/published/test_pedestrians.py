"""People walk as pedestrians are known to: desired speeds, and speed against density in a one-way corridor.

Sources: desired speeds are normal with mean 1.34 m/s and standard deviation 0.26 m/s (Helbing and Molnar, Physical
Review E 51, 1995, 4282, after Henderson, Nature 229, 1971, 381). Speed against density is the curve of Weidmann,
Transporttechnik der Fussgaenger, ETH Zuerich, IVT 90 (1993): v = 1.34 (1 - exp(-1.913 (1 / rho - 1 / 5.4))).
The corridor is closed to a ring, 20 m long and 3 m wide, and moved by the simulator's own kernels.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.ndimage import distance_transform_edt
from scipy.stats import norm

from backends.sim.kernels.crowd import step
from backends.sim.people import SLOWEST_M_S, drawn_speeds
from runner.site.values import CELL_M, Walkers

LENGTH_M, WIDTH_M, WALL_M, SEAM_M = 20.0, 3.0, 0.2, 5.0
"""The corridor, its walls, and how much of it is repeated at each end so that everybody sees neighbors there."""
TICK_S, SETTLE_S, MEASURE_S = 0.1, 30.0, 30.0
ROBOT = np.array([-100.0, -100.0, 0.0])
OUTLINE = np.array([[0.3, 0.3], [-0.3, 0.3], [-0.3, -0.3], [0.3, -0.3]])


def weidmann(density: float) -> float:
    return 1.34 * (1.0 - math.exp(-1.913 * (1.0 / density - 1.0 / 5.4)))


def test_the_curve_of_weidmann_is_the_one_of_the_tables() -> None:
    for density, speed in ((0.5, 1.29838), (1.0, 1.05806), (1.5, 0.80656), (2.0, 0.60624)):
        assert weidmann(density) == pytest.approx(speed, abs=1e-5)


def test_desired_speeds_are_normal_as_published() -> None:
    speeds = drawn_speeds(Walkers(20_000), np.random.default_rng(1))
    assert np.mean(speeds) == pytest.approx(1.34, abs=0.01)
    assert np.std(speeds) == pytest.approx(0.26, abs=0.01)
    low, high = np.quantile(speeds, [0.05, 0.95])
    assert (low, high) == (pytest.approx(0.912338, abs=0.02), pytest.approx(1.767662, abs=0.02))
    assert np.mean(speeds > 1.6) == pytest.approx(0.1586553, abs=0.01)
    assert norm.cdf(SLOWEST_M_S, 1.34, 0.26) < 2e-4  # what is cut off below is next to nobody


@pytest.mark.parametrize("density", [0.25, 0.5, 0.75, 1.0, 1.25, 1.5])
def test_speed_falls_with_density_as_weidmann_found(density: float) -> None:
    speed = float(np.mean([mean_speed(density, seed) for seed in (1, 2, 3)]))
    off = speed / weidmann(density) - 1.0
    print(f"{density} a square meter: {speed:.2f} m/s, Weidmann {weidmann(density):.2f} m/s, {off:+.0%}")
    assert abs(off) < 0.2


def mean_speed(density: float, seed: int) -> float:
    """Mean speed along a ring corridor, once it has settled."""
    random = np.random.default_rng(seed)
    count = round(density * LENGTH_M * WIDTH_M)
    bodies = np.column_stack([_spread_out(count, random), random.uniform(0.25, 0.35, count)])
    wished = drawn_speeds(Walkers(count), random)
    velocity = np.column_stack([0.7 * wished, np.zeros(count)])
    walls = _walls()
    made: list[float] = []
    for tick in range(round((SETTLE_S + MEASURE_S) / TICK_S)):
        before = bodies[:, 0].copy()
        bodies, velocity = _stepped(bodies, velocity, wished, walls)
        if tick * TICK_S >= SETTLE_S:
            made.append(float(np.mean(bodies[:, 0] - before)) / TICK_S)
        bodies[:, 0] = SEAM_M + (bodies[:, 0] - SEAM_M) % LENGTH_M
    return float(np.mean(made))


def _stepped(
    bodies: NDArray[np.float64], velocity: NDArray[np.float64], wished: NDArray[np.float64], walls: NDArray[np.float32]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """One tick; those near one end are seen beyond the other."""
    count = len(bodies)
    people, speeds, wishes = [bodies], [velocity], [wished]
    for shift in (-LENGTH_M, LENGTH_M):
        copy = bodies + np.array([shift, 0.0, 0.0])
        near = (copy[:, 0] > SEAM_M - 4.2) & (copy[:, 0] < SEAM_M + LENGTH_M + 4.2)
        people.append(copy[near])
        speeds.append(velocity[near])
        wishes.append(wished[near])
    everybody, all_speeds = np.vstack(people), np.vstack(speeds)
    target = np.column_stack([everybody[:, 0] + 10.0, everybody[:, 1], np.full(len(everybody), 0.2)])
    step(everybody, all_speeds, target, np.concatenate(wishes), walls, OUTLINE, 0.45, ROBOT, TICK_S)
    return everybody[:count].copy(), all_speeds[:count].copy()


def _walls() -> NDArray[np.float32]:
    """Distance to the two walls, open at both ends."""
    rows, columns = round((WIDTH_M + 2.0 * WALL_M) / CELL_M), round((LENGTH_M + 2.0 * SEAM_M) / CELL_M) + 2
    free = np.ones((rows, columns), dtype=np.bool_)
    thick = round(WALL_M / CELL_M)
    free[:thick] = free[-thick:] = False
    return np.minimum(distance_transform_edt(free, sampling=CELL_M), 2.0).astype(np.float32)


def _spread_out(count: int, random: np.random.Generator) -> NDArray[np.float64]:
    """So many points, nowhere two on top of each other."""
    across = max(1, round(math.sqrt(count * WIDTH_M / LENGTH_M)))
    along = math.ceil(count / across)
    x = SEAM_M + (np.arange(along) + 0.5) * LENGTH_M / along
    y = WALL_M + (np.arange(across) + 0.5) * WIDTH_M / across
    grid = np.stack(np.meshgrid(x, y), axis=-1).reshape(-1, 2)
    return random.permutation(grid)[:count] + random.uniform(-0.05, 0.05, (count, 2))
