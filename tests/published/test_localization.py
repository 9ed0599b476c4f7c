"""Odometry, sample sizes, the likelihood field and the stated error of localization, against published equations."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
import pytest
from numpy.typing import NDArray

from backends.contract import GoalReport
from backends.sim.kernels.particles import enough, likelihood, off_surface
from backends.sim.likelihood import RANDOM
from backends.sim.odometry import Wheels
from runner.site.values import CELL_M, Conditions, Odometry, Pose, Walkers
from tests.backends.sim.support import TWO_ROOMS, Drive, go, is_end, start

SIZES = [
    (0.05, 2.326348, {2: 65.858, 3: 92.205, 5: 133.057, 10: 216.966, 20: 362.165, 50: 749.376, 100: 1346.550}),
    (0.05, 1.644854, {2: 37.468, 3: 59.369, 5: 94.560, 10: 169.024, 20: 301.344, 50: 663.343, 100: 1232.227}),
    (0.01, 2.326348, {2: 329.289, 10: 1084.830, 100: 6732.752}),
]
"""Fox, International Journal of Robotics Research 22 (2003), equation 7; the numbers computed from it."""

CHI_SQUARE_95 = 5.991464547
"""The 95 % point of chi-square with two degrees of freedom: -2 ln 0.05."""


@pytest.mark.parametrize(("error", "quantile", "sizes"), SIZES)
def test_sample_sizes_are_those_of_the_kullback_leibler_bound(
    error: float, quantile: float, sizes: dict[int, float]
) -> None:
    for bins, size in sizes.items():
        assert enough(bins, error, quantile) == pytest.approx(size, abs=1e-3)


def test_a_single_bin_asks_for_no_more_than_the_least() -> None:
    assert enough(1, 0.05, 2.326348) == 0.0


@pytest.mark.parametrize(
    ("distance", "value"),
    [(0.0, 1.6157691), (0.2, 0.9878829), (0.4, 0.2359638), (1.0, 0.0200059), (3.0, 0.02)],
)
def test_a_beam_is_worth_what_the_likelihood_field_says(distance: float, value: float) -> None:
    """Thrun, Burgard and Fox, Probabilistic Robotics (2005), table 6.3: 0.8 N(d; 0, 0.2) + 0.2 / 10; computed by hand
    as 0.8 * 1.99471140 * exp(-12.5 d^2) + 0.02."""
    assert likelihood(distance, 0.8, 0.2, 0.2, 10.0) == pytest.approx(value, abs=1e-6)


def test_a_beam_far_from_everything_keeps_its_share_of_chance() -> None:
    assert likelihood(50.0, 0.8, 0.08, RANDOM, 10.0) == pytest.approx(RANDOM / 10.0)


def test_a_distance_between_cells_is_interpolated_and_off_the_map_is_infinite() -> None:
    signed = np.array([[0.0, 1.0], [2.0, 3.0]], dtype=np.float32)
    middle = CELL_M
    assert off_surface(signed, middle, middle) == pytest.approx(1.5)
    assert off_surface(signed, -1.0, 0.0) == math.inf


# --- odometry -------------------------------------------------------------------------------------------------------

NOISE = Odometry()
RUNS = 1500


def ends(speed: float, turn: float, steps: int) -> NDArray[np.float64]:
    """Where odometry says that each of many equal drives ended."""
    generator = np.random.default_rng(1)
    found = []
    for _ in range(RUNS):
        wheels = Wheels(NOISE, generator)
        for _ in range(steps):
            wheels.advance(speed, 0.0, turn, 0.1)
        found.append((wheels.pose.x, wheels.pose.y, wheels.pose.heading))
    return np.array(found)


def step_variances(speed: float, turn: float) -> tuple[float, float, float]:
    """Variances of way, turn and last turn in one step: table 5.3, sample(alpha_1 v^2 + alpha_2 w^2) and so on."""
    way, angle = speed * 0.1, turn * 0.1
    return (
        (NOISE.way_by_way * way) ** 2 + (NOISE.way_by_turn * angle) ** 2,
        (NOISE.turn_by_way * way) ** 2 + (NOISE.turn_by_turn * angle) ** 2,
        (NOISE.last_turn_by_way * way) ** 2 + (NOISE.last_turn_by_turn * angle) ** 2,
    )


def test_odometry_of_a_straight_drive_spreads_as_its_closed_form_says() -> None:
    """Way: N steps of independent noise. Heading: a random walk. Sideways: its sum, weighted by the way still to go."""
    speed, steps = 0.8, 100
    of_way, of_turn, of_last = step_variances(speed, 0.0)
    step = speed * 0.1
    left = np.arange(steps)[::-1]
    sideways = step**2 * float(np.sum((left + 0.5) ** 2 * of_turn + left**2 * of_last))
    x, y, heading = ends(speed, 0.0, steps).T
    loss = 0.5 * step * (of_turn + of_last) * steps * (steps - 1) / 2  # by cos(heading) < 1, in the mean
    assert x.mean() == pytest.approx(speed * 0.1 * steps - loss, abs=0.01)
    assert np.std(x) == pytest.approx(math.sqrt(of_way * steps), rel=0.07)
    assert np.std(y) == pytest.approx(math.sqrt(sideways), rel=0.07)
    assert np.std(heading) == pytest.approx(math.sqrt((of_turn + of_last) * steps), rel=0.07)
    print(f"sideways after 8 m: {np.std(y):.4f} m, closed form {math.sqrt(sideways):.4f} m")


def test_odometry_of_a_circle_spreads_as_its_linearized_closed_form_says() -> None:
    """First order: the sum over steps of J Q J', J by differences of the exact arc about the drive without noise."""
    speed, turn, steps = 0.5, 0.5, 80
    of_way, of_turn, of_last = step_variances(speed, turn)
    covariance = np.zeros((3, 3))
    pose = np.zeros(3)
    for _ in range(steps):
        here = arc_by(pose, speed * 0.1, turn * 0.1)
        small = 1e-6
        by_pose = np.column_stack(
            [(arc_by(pose + d, speed * 0.1, turn * 0.1) - here) / small for d in small * np.eye(3)]
        )
        by_way = (arc_by(pose, speed * 0.1 + small, turn * 0.1) - here) / small
        by_turn = (arc_by(pose, speed * 0.1, turn * 0.1 + small) - here) / small
        covariance = by_pose @ covariance @ by_pose.T + of_way * np.outer(by_way, by_way)
        covariance += of_turn * np.outer(by_turn, by_turn)
        covariance[2, 2] += of_last
        pose = here
    found = ends(speed, turn, steps)
    assert found.mean(axis=0) == pytest.approx(pose, abs=0.01)
    assert np.std(found, axis=0) == pytest.approx(np.sqrt(np.diag(covariance)), rel=0.08)


def arc_by(pose: NDArray[np.float64], way: float, turn: float) -> NDArray[np.float64]:
    """The exact arc, written anew: not from the code under test."""
    x, y, heading = pose
    radius = way / turn
    return np.array(
        [
            x + radius * (math.sin(heading + turn) - math.sin(heading)),
            y + radius * (math.cos(heading) - math.cos(heading + turn)),
            heading + turn,
        ]
    )


# --- the stated error -----------------------------------------------------------------------------------------------


@dataclass
class Seen:
    """Of ticks at rest or moving: how many, in how many the truth lay within the stated ellipse, and the errors."""

    inside: list[bool]
    errors: list[float]
    stated: list[float]

    @property
    def share(self) -> float:
        return sum(self.inside) / len(self.inside)


def watched(seed: int, seconds: float) -> tuple[Seen, Seen]:
    """A drive to and fro between two rooms with six people about: what was seen at rest, and moving."""
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, conditions=Conditions(walkers=(Walkers(6),)))
    rest, moving = Seen([], [], []), Seen([], [], [])
    think = drive.simulator.robot.think

    def look(now: float) -> object:
        note(drive, rest if drive.simulator.body.drive.still else moving)
        return think(now)

    drive.simulator.robot.think = look  # type: ignore[method-assign, assignment]
    poses = (Pose(12.0, 7.0, math.pi), Pose(4.5, 4.5, 0.0), Pose(12.0, 2.0, 1.0), Pose(2.0, 2.0, 0.0))
    number = 0
    while drive.simulator.clock.now() < seconds:
        number += 1
        drive.simulator.clear(number, 3.0)
        go(drive, number, poses[number % 4])
        ended = drive.until(min(seconds, drive.simulator.clock.now() + 60.0), is_end)
        if isinstance(ended, GoalReport):
            drive.until(drive.simulator.clock.now() + 5.0)
    return rest, moving


def note(drive: Drive, seen: Seen) -> None:
    believed, true = drive.simulator.robot.pose, drive.simulator.body.pose
    off = np.array([believed.x - true.x, believed.y - true.y])
    covariance = drive.simulator.localization.covariance[:2, :2]
    seen.inside.append(bool(off @ np.linalg.solve(covariance, off) <= CHI_SQUARE_95))
    seen.errors.append(float(np.hypot(*off)))
    seen.stated.append(drive.simulator.localization.spread)


def test_the_truth_lies_within_the_stated_ellipse_at_rest_and_moving() -> None:
    """The 95 % ellipse that the covariance states, in at least 90 % of ticks; six people are about."""
    rest, moving = Seen([], [], []), Seen([], [], [])
    for seed in (1, 2, 3, 4):
        for total, part in zip((rest, moving), watched(seed, 600.0), strict=True):
            total.inside += part.inside
            total.errors += part.errors
            total.stated += part.stated
    for name, seen in (("at rest", rest), ("moving", moving)):
        error, stated = np.mean(seen.errors), np.mean(seen.stated)
        print(f"{name}: {seen.share:.1%} of {len(seen.inside)} ticks; mean error {error:.3f} m, stated {stated:.3f} m")
    assert rest.share >= 0.9
    assert moving.share >= 0.9


def test_a_robot_without_noise_in_its_wheels_counts_its_way_exactly() -> None:
    wheels = Wheels(replace(NOISE, way_by_way=0.0, turn_by_way=0.0, last_turn_by_way=0.0), np.random.default_rng(1))
    for _ in range(100):
        wheels.advance(0.5, 0.0, 0.0, 0.1)
    assert (wheels.pose.x, wheels.pose.y, wheels.pose.heading) == pytest.approx((5.0, 0.0, 0.0))
