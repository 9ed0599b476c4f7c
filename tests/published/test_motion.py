"""Motion and its limits against published equations."""

from __future__ import annotations

import math

import numpy as np
import pytest

from backends.sim.kernels.motion import admissible, arc, glide
from backends.sim.kernels.window import unit_arc

ARCS = [
    ((0.0, 0.0, 0.0), 1.0, 0.5, 1.0, (0.9588510772, 0.2448348762, 0.5)),
    ((1.0, 2.0, math.pi / 4), 0.5, 1.0, 2.0, (0.8208016727, 2.8221687040, 2.7853981634)),
    ((0.0, 0.0, 0.0), 1.0, math.pi / 2, 1.0, (0.6366197724, 0.6366197724, math.pi / 2)),
    ((0.0, 0.0, 1.0), -0.3, 0.7, 0.5, (-0.0575367313, -0.1376981223, 1.35)),
]
"""Thrun, Burgard and Fox, Probabilistic Robotics (2005), table 5.3 without noise; the numbers computed from it."""


@pytest.mark.parametrize(("start", "speed", "turn", "time", "end"), ARCS)
def test_an_arc_ends_where_the_exact_motion_model_says(
    start: tuple[float, float, float], speed: float, turn: float, time: float, end: tuple[float, float, float]
) -> None:
    assert arc(*start, speed, turn, time) == pytest.approx(end, abs=1e-10)


@pytest.mark.parametrize("turn", [0.0, 1e-9, -1e-7, 5e-6])
def test_an_arc_passes_smoothly_into_a_straight_line(turn: float) -> None:
    assert arc(1.0, 2.0, 0.3, 0.8, turn, 2.0) == pytest.approx(
        (1.0 + 1.6 * math.cos(0.3), 2.0 + 1.6 * math.sin(0.3), 0.3), abs=2e-5
    )


@pytest.mark.parametrize(("turn", "speed"), [(0.0, 0.7), (0.5, 0.8), (-1.2, 0.2), (2.0, 1.5)])
def test_arcs_rolled_out_step_by_step_agree_with_the_exact_motion_model(turn: float, speed: float) -> None:
    rows = np.empty((21, 4))
    unit_arc(0.4, turn, rows)
    for step, (x, y, cosine, sine) in enumerate(rows.tolist()):
        exact_x, exact_y, heading = arc(0.0, 0.0, 0.4, speed, turn, step * 0.1)
        assert (speed * x, speed * y) == pytest.approx((exact_x, exact_y), abs=1e-12)
        left_x, left_y, _ = glide(0.0, 0.0, 0.4, 0.0, speed, turn, step * 0.1)
        assert (-speed * y, speed * x) == pytest.approx((left_x, left_y), abs=1e-12)
        assert (cosine, sine) == pytest.approx((math.cos(heading), math.sin(heading)), abs=1e-12)


@pytest.mark.parametrize(
    ("distance", "deceleration", "speed"),
    [
        (0.5, 0.5, 0.70710678),
        (1.0, 0.5, 1.0),
        (2.0, 0.5, 1.41421356),
        (1.0, 1.0, 1.41421356),
        (0.1, 0.3, 0.24494897),
    ],
)
def test_admissible_speeds_are_those_of_the_dynamic_window(distance: float, deceleration: float, speed: float) -> None:
    """Fox, Burgard and Thrun, IEEE Robotics and Automation Magazine 4(1), 1997: v <= sqrt(2 dist a)."""
    assert admissible(distance, deceleration) == pytest.approx(speed, abs=1e-8)


def test_nothing_is_admissible_without_room() -> None:
    assert admissible(-0.1, 0.5) == 0.0
