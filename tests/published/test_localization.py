"""Sample sizes, the likelihood field and the stated error of localization, against published equations."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import datetime

import numpy as np
import pytest

from backends.contract import GoalReport, Setup
from backends.sim.kernels.particles import enough, likelihood, off_surface
from backends.sim.likelihood import RANDOM
from backends.sim.parts import Wish
from backends.sim.simulator import Simulator
from runner.language.reader import load_robot, load_site
from runner.site.values import CELL_M, Conditions, Pose, Walkers
from tests.backends.sim.support import TWO_ROOMS, go, is_end, start
from tests.bench.night import MISSIONS, rounds

SIZES = [
    (
        0.05,
        2.326348,
        {2: 65.858, 3: 92.205, 5: 133.057, 10: 216.966, 20: 362.165, 50: 749.376, 100: 1346.550, 500: 5754.255},
    ),
    (
        0.05,
        1.644854,
        {2: 37.468, 3: 59.369, 5: 94.560, 10: 169.024, 20: 301.344, 50: 663.343, 100: 1232.227, 500: 5520.739},
    ),
    (0.01, 2.326348, {2: 329.289, 10: 1084.830, 100: 6732.752}),
]
"""Fox, International Journal of Robotics Research 22 (2003), equation 7; the numbers computed from it."""

CHI_SQUARE_95 = 5.991464547
"""The 95 % point of chi-square with two degrees of freedom: -2 ln 0.05."""
SECONDS = 600.0
"""Of each drive."""


@pytest.mark.parametrize(("error", "quantile", "sizes"), SIZES)
def test_sample_sizes_are_those_of_the_kullback_leibler_bound(
    error: float, quantile: float, sizes: dict[int, float]
) -> None:
    for bins, size in sizes.items():
        assert enough(bins, error, quantile) == pytest.approx(size, abs=1e-3)


def test_a_single_bin_asks_for_no_more_than_the_least() -> None:
    assert enough(1, 0.05, 2.326348) == 0.0


@pytest.mark.parametrize(
    ("sigma", "distance", "value"),
    [
        (0.1, 0.0, 3.2115382), (0.1, 0.1, 1.9557658), (0.1, 0.2, 0.4519277), (0.1, 0.5, 0.0200119),
        (0.2, 0.0, 1.6157691), (0.2, 0.2, 0.9878829), (0.2, 0.4, 0.2359638), (0.2, 1.0, 0.0200059), (0.2, 3.0, 0.02),
    ],
)  # fmt: skip
def test_a_beam_is_worth_what_the_likelihood_field_says(sigma: float, distance: float, value: float) -> None:
    """Thrun, Burgard and Fox, Probabilistic Robotics (2005), table 6.3: 0.8 N(d; 0, sigma) + 0.2 / 10; the numbers
    computed from it."""
    assert likelihood(distance, 0.8, sigma, 0.2, 10.0) == pytest.approx(value, abs=1e-6)


def test_a_beam_far_from_everything_keeps_its_share_of_chance() -> None:
    assert likelihood(50.0, 0.8, 0.08, RANDOM, 10.0) == pytest.approx(RANDOM / 10.0)


def test_a_distance_between_cells_is_interpolated_and_off_the_map_is_infinite() -> None:
    signed = np.array([[0.0, 1.0], [2.0, 3.0]], dtype=np.float32)
    middle = CELL_M
    assert off_surface(signed, middle, middle) == pytest.approx(1.5)
    assert off_surface(signed, -1.0, 0.0) == math.inf


# --- the stated error -----------------------------------------------------------------------------------------------


@dataclass
class Seen:
    """Of ticks at rest or moving: in how many the truth lay within the stated ellipse, the errors, what was stated."""

    inside: list[bool] = field(default_factory=list)
    errors: list[float] = field(default_factory=list)
    stated: list[float] = field(default_factory=list)

    @property
    def share(self) -> float:
        return sum(self.inside) / len(self.inside)


@dataclass
class Watch:
    """Compares belief and truth every tick, where the robot thinks: before the body moves on."""

    rest: Seen = field(default_factory=Seen)
    moving: Seen = field(default_factory=Seen)

    def over(self, simulator: Simulator) -> None:
        think = simulator.robot.think

        def look(now: float) -> Wish:
            note(simulator, self.rest if simulator.body.drive.still else self.moving)
            return think(now)

        simulator.robot.think = look  # type: ignore[method-assign]


def note(simulator: Simulator, seen: Seen) -> None:
    believed, true = simulator.robot.pose, simulator.body.pose
    off = np.array([believed.x - true.x, believed.y - true.y])
    covariance = simulator.localization.covariance[:2, :2]
    seen.inside.append(bool(off @ np.linalg.solve(covariance, off) <= CHI_SQUARE_95))
    seen.errors.append(float(np.hypot(*off)))
    seen.stated.append(simulator.localization.spread)


def between_two_rooms(seed: int, watch: Watch) -> None:
    """To and fro between two rooms with six people about, with rests."""
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, conditions=Conditions(walkers=(Walkers(6),)))
    watch.over(drive.simulator)
    poses = (Pose(12.0, 7.0, math.pi), Pose(4.5, 4.5, 0.0), Pose(12.0, 2.0, 1.0), Pose(2.0, 2.0, 0.0))
    number = 0
    while drive.simulator.clock.now() < SECONDS:
        number += 1
        drive.simulator.clear(number, 3.0)
        go(drive, number, poses[number % 4])
        ended = drive.until(min(SECONDS, drive.simulator.clock.now() + 60.0), is_end)
        if isinstance(ended, GoalReport):
            drive.until(drive.simulator.clock.now() + 5.0)


def round_the_clinic(seed: int, watch: Watch) -> None:
    """A shipped robot goes round a shipped site by day, with twelve people about."""
    site, robot = load_site(MISSIONS / "sites/harbour-clinic.yaml"), load_robot(MISSIONS / "robots/small-cart.yaml")
    conditions = Conditions(walkers=(Walkers(12),))
    simulator = Simulator(Setup(site, robot, site.places[0].pose, conditions, seed, datetime(2026, 1, 5, 14)))
    watch.over(simulator)
    rounds(simulator, SECONDS)


@pytest.mark.parametrize("drive", [between_two_rooms, round_the_clinic])
def test_the_truth_lies_within_the_stated_ellipse_at_rest_and_moving(
    drive: Callable[[int, Watch], None], record_property: Callable[[str, object], None]
) -> None:
    """The 95 % ellipse that the covariance states holds the truth in at least 90 % of ticks, and is no excuse: it
    is a few centimeters wide."""
    watch = Watch()
    for seed in (1, 2, 3, 4):
        drive(seed, watch)
    for name, seen in (("at rest", watch.rest), ("moving", watch.moving)):
        error, stated = np.mean(seen.errors), np.mean(seen.stated)
        line = f"{seen.share:.1%} of {len(seen.inside)} ticks; mean error {error:.4f} m, stated {stated:.4f} m"
        print(f"{drive.__name__}, {name}: {line}")
        record_property(f"within the stated ellipse, {name}", line)
        assert len(seen.inside) > 1000
        assert seen.share >= 0.9
        assert stated < 0.05
