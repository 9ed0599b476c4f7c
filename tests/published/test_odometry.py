"""How odometry spreads over many equal drives, against the closed form of the velocity motion model.

Thrun, Burgard and Fox, Probabilistic Robotics (2005), table 5.3: within a step of dt the way is drawn with variance
(a1 v^2 + a2 w^2) dt^2, the turn with (a3 v^2 + a4 w^2) dt^2, and a last turn on the spot with (a5 v^2 + a6 w^2) dt^2.
Steps are independent, so that their variances add up: to n times as much of way and heading after n equal steps.

Where the drive ends follows to first order. An error of the way shifts the end along the step. An error of heading
turns all that comes after it, so that the end moves square to the line from there to the end: a last turn about the
end of its step, a turn on the arc about the middle of its step. On a straight line of steps of length l this leaves
l^2 sum (k + 1/2)^2 and l^2 sum k^2 over k = 0 .. n - 1 steps still to go.

What is allowed: n drives find a variance within the chi-square distribution with n - 1 degrees of freedom. Bounds are
those of 99.9 % (two sides), the mean within 3.3 of its deviations.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.stats import chi2

from backends.sim.odometry import Wheels
from runner.site.values import Odometry

STEP_S = 0.1
DRIVES = 800
SURELY, DEVIATIONS = 0.999, 3.3
STRONG = Odometry(0.08, 0.05, 0.05, 0.06, 0.02, 0.03)
"""All six parameters tell in it."""


@dataclass(frozen=True)
class Motion:
    """`speed` ahead and `side` to the left in m/s, `turn` in rad/s, for so many steps."""

    speed: float
    turn: float
    steps: int
    side: float = 0.0


STRAIGHT = Motion(0.8, 0.0, 125)
"""10 m."""
ON_THE_SPOT = Motion(0.0, 0.9, 70)
"""A full turn."""
ARC = Motion(0.6, 0.3, 80)
SIDEWAYS = Motion(0.0, 0.0, 100, side=0.5)


@cache
def drives(noise: Odometry, motion: Motion) -> NDArray[np.float64]:
    """Rows of x, y and heading that odometry has at the ends of many equal drives, each on a seed of its own."""
    found = np.empty((DRIVES, 3))
    for seed in range(DRIVES):
        wheels = Wheels(noise, np.random.default_rng(seed))
        for _ in range(motion.steps):
            wheels.advance(motion.speed, motion.side, motion.turn, STEP_S)
        found[seed] = (wheels.pose.x, wheels.pose.y, wheels.pose.heading)
    return found


def variances(noise: Odometry, motion: Motion) -> tuple[float, float, float]:
    """Of the way, the turn and the last turn of one step."""
    way, angle = math.hypot(motion.speed, motion.side) * STEP_S, motion.turn * STEP_S
    return (
        noise.way_by_way**2 * way**2 + noise.way_by_turn**2 * angle**2,
        noise.turn_by_way**2 * way**2 + noise.turn_by_turn**2 * angle**2,
        noise.last_turn_by_way**2 * way**2 + noise.last_turn_by_turn**2 * angle**2,
    )


def spots(motion: Motion, count: int) -> NDArray[np.float64]:
    """Where the drive without noise is after so many half steps, and the heading there: rows of x, y, heading.

    The exact motion, by complex numbers: the integral of (v + i s) exp(i w t).
    """
    time = 0.5 * STEP_S * np.arange(count)
    heading = motion.turn * time
    way = (np.exp(1j * heading) - 1.0) / (1j * motion.turn) if motion.turn else time + 0j
    way = way * complex(motion.speed, motion.side)
    return np.asarray(np.column_stack([way.real, way.imag, heading]), dtype=np.float64)


def closed_form(noise: Odometry, motion: Motion) -> NDArray[np.float64]:
    """The covariance (3, 3) of x, y and heading at the end, as above."""
    of_way, of_turn, of_last = variances(noise, motion)
    half = spots(motion, 2 * motion.steps + 1)
    end, middles, ends = half[-1], half[1::2], half[2::2]
    ahead = math.atan2(motion.side, motion.speed) + middles[:, 2]
    along = np.column_stack([np.cos(ahead), np.sin(ahead), np.zeros(motion.steps)])
    total = of_way * along.T @ along
    for variance, pivots in ((of_turn, middles), (of_last, ends)):
        swung = np.column_stack([pivots[:, 1] - end[1], end[0] - pivots[:, 0], np.ones(motion.steps)])
        total += variance * swung.T @ swung
    return np.asarray(total, dtype=np.float64)


def assert_variance(found: NDArray[np.float64], expected: float) -> None:
    """Whether independent numbers may well have that variance."""
    free = len(found) - 1
    least, most = chi2.ppf([0.5 - SURELY / 2.0, 0.5 + SURELY / 2.0], free) / free
    assert least <= np.var(found, ddof=1) / expected <= most


@pytest.mark.parametrize("noise", [Odometry(), STRONG], ids=["as shipped", "all six parameters"])
@pytest.mark.parametrize(
    "motion", [STRAIGHT, ON_THE_SPOT, ARC, SIDEWAYS], ids=["straight", "on the spot", "arc", "sideways"]
)
def test_the_heading_spreads_by_the_sum_of_its_steps(noise: Odometry, motion: Motion) -> None:
    _, of_turn, of_last = variances(noise, motion)
    heading = drives(noise, motion)[:, 2]
    expected = motion.steps * (of_turn + of_last)
    assert_variance(heading, expected)
    assert abs(heading.mean() - motion.turn * motion.steps * STEP_S) < DEVIATIONS * math.sqrt(expected / DRIVES)


def test_ten_meters_straight_spread_along_and_across_as_the_closed_form_says() -> None:
    """Across, in words of its own: l^2 (sum (k + 1/2)^2 var(turn) + sum k^2 var(last))."""
    of_way, of_turn, of_last = variances(Odometry(), STRAIGHT)
    x, y, _ = drives(Odometry(), STRAIGHT).T
    togo, step = np.arange(STRAIGHT.steps), STRAIGHT.speed * STEP_S
    along = STRAIGHT.steps * of_way
    across = step**2 * float(np.sum((togo + 0.5) ** 2 * of_turn + togo**2 * of_last))
    assert_variance(x, along)
    assert_variance(y, across)
    assert closed_form(Odometry(), STRAIGHT)[[0, 1], [0, 1]] == pytest.approx([along, across], rel=1e-9)
    for name, seen, expected in (("along", x, along), ("across", y, across)):
        print(f"10 m straight: {name} {np.std(seen):.4f} m, closed form {math.sqrt(expected):.4f} m, {DRIVES} drives")


@pytest.mark.parametrize("motion", [STRAIGHT, ARC, SIDEWAYS], ids=["straight", "arc", "sideways"])
def test_the_end_of_a_drive_spreads_in_every_direction_as_the_closed_form_says(motion: Motion) -> None:
    """Along both axes of the ellipse that the closed form has of x and y."""
    expected = closed_form(Odometry(), motion)
    found = drives(Odometry(), motion)
    sizes, axes = np.linalg.eigh(expected[:2, :2])
    for size, axis in zip(sizes, axes.T, strict=True):
        assert_variance(found[:, :2] @ axis, float(size))
    assert found.mean(axis=0) == pytest.approx(spots(motion, 2 * motion.steps + 1)[-1], abs=0.015)


def test_where_a_drive_ends_and_how_it_points_there_go_together() -> None:
    """The squared distance from the mean by the whole covariance is chi-square with three degrees of freedom."""
    found = drives(Odometry(), ARC)
    off = found - spots(ARC, 2 * ARC.steps + 1)[-1]
    squares = np.einsum("ni,ij,nj->n", off, np.linalg.inv(closed_form(Odometry(), ARC)), off)
    share = float(np.mean(squares <= chi2.ppf(0.95, 3)))
    assert abs(share - 0.95) < DEVIATIONS * math.sqrt(0.95 * 0.05 / DRIVES)


def test_a_turn_on_the_spot_lets_the_believed_place_wander_as_the_model_has_it() -> None:
    """Table 5.3 draws the way with a2 w^2 also where there is none to make: ahead or back."""
    found = drives(STRONG, ON_THE_SPOT)
    expected = closed_form(STRONG, ON_THE_SPOT)
    assert_variance(found[:, 0], expected[0, 0])
    assert_variance(found[:, 1], expected[1, 1])


def test_without_noise_every_drive_ends_where_the_exact_motion_does() -> None:
    for motion in (STRAIGHT, ON_THE_SPOT, ARC, SIDEWAYS):
        wheels = Wheels(Odometry(0.0, 0.0, 0.0, 0.0, 0.0, 0.0), np.random.default_rng(1))
        for _ in range(motion.steps):
            wheels.advance(motion.speed, motion.side, motion.turn, STEP_S)
        end = (wheels.pose.x, wheels.pose.y, wheels.pose.heading)
        assert end == pytest.approx(tuple(spots(motion, 2 * motion.steps + 1)[-1]), abs=1e-9)
