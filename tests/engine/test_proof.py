"""The proof that may be looked at after every leg: its formula against scipy, its promise by exact computation."""

from __future__ import annotations

from math import lgamma, log, log1p

import numpy as np
import pytest
from scipy.stats import beta

from runner.engine.proof import log_evidence, proven


@pytest.mark.parametrize(("arrived", "failed"), [(1, 0), (45, 0), (71, 0), (100, 1), (300, 5), (5000, 100), (9, 1)])
@pytest.mark.parametrize("share", [0.5, 0.9, 0.95, 0.99])
def test_the_evidence_is_the_mixture_over_better_shares_against_the_claim(
    arrived: int, failed: int, share: float
) -> None:
    """Against scipy's beta distribution; only where more arrived than the claim's share, as the test asks it."""
    if arrived <= share * (arrived + failed):
        pytest.skip("not asked for there")
    log_beta = lgamma(arrived + 1) + lgamma(failed + 1) - lgamma(arrived + failed + 2)
    expected = beta.logsf(share, arrived + 1, failed + 1) + log_beta - log1p(-share)
    expected -= arrived * log(share) + failed * log1p(-share)
    assert log_evidence(arrived, failed, share) == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize(("share", "confidence"), [(0.9, 0.8), (0.95, 0.9)])
def test_a_robot_just_not_good_enough_is_hardly_ever_proved_good_however_often_one_looks(
    share: float, confidence: float
) -> None:
    """The chance of ever crossing in 1500 legs, exactly, by following the distribution of the count of failures."""
    alive, crossed = np.array([1.0]), 0.0
    for legs in range(1, 1501):
        following = np.zeros(len(alive) + 1)
        following[:-1] += alive * share
        following[1:] += alive * (1.0 - share)
        for failed in range(min(len(following), 200)):
            if following[failed] > 0.0 and proven(legs - failed, failed, share, confidence):
                crossed += following[failed]
                following[failed] = 0.0
        alive = following
    assert 0.2 * (1.0 - confidence) < crossed <= 1.0 - confidence


def test_a_good_robot_is_proved_good_before_long() -> None:
    assert not proven(70, 0, 0.95, 0.90)
    assert proven(71, 0, 0.95, 0.90)


def test_nothing_is_proved_by_nothing_nor_against_the_evidence() -> None:
    assert not proven(0, 0, 0.5, 0.5)
    assert not proven(50, 50, 0.9, 0.5)
