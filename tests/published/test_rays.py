"""Ranges of the lidar against plane geometry, worked out by shapely."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import pytest
import shapely
from numpy.typing import NDArray

from backends.sim.kernels.grid import bearing_of
from backends.sim.kernels.overlap import covers_solid, gap
from backends.sim.kernels.rays import cast, scan
from runner.site.floor import clearance, rasterize
from runner.site.values import CELL_M, Site, Solid

ROOM = Site("room", 10.0, 6.0, (), (Solid(((4.0, 2.0), (5.0, 2.0), (5.0, 3.0), (4.0, 3.0))),), (), ())
EYE = (2.0, 2.5)
PERSON = (7.0, 3.0, 0.25)
RANGES = {
    0: 2.0, 15: 8.282209, 30: 7.0, 45: 4.949747, 60: 4.041452, 90: 3.5, 120: 4.0, 135: 2.828427, 180: 2.0,
    225: 2.828427, 270: 2.5, 315: 3.535534,
}  # fmt: skip
"""By shapely 2.2: a room of 10 x 6 m, a box at x 4 to 5, y 2 to 3, seen from (2, 2.5), degrees to meters."""


def field(site: Site) -> NDArray[np.float32]:
    return clearance(rasterize(site).blocked())


def toward(distance: NDArray[np.float32], degrees: float, reach: float = 20.0) -> float:
    angle = math.radians(degrees)
    return float(cast(distance, *EYE, math.cos(angle), math.sin(angle), reach))


@pytest.mark.parametrize(("degrees", "expected"), RANGES.items())
def test_ranges_in_a_room_with_a_box(degrees: float, expected: float) -> None:
    assert toward(field(ROOM), degrees) == pytest.approx(expected, abs=1e-5)


def test_a_range_farther_than_the_lidar_reaches_is_none() -> None:
    assert toward(field(ROOM), 30.0, 6.9) == math.inf
    assert toward(field(ROOM), 30.0, 7.1) == pytest.approx(7.0)


def shortest(shapes: Sequence[shapely.Geometry], x: float, y: float, angle: float, reach: float) -> float:
    ray = shapely.LineString([(x, y), (x + reach * math.cos(angle), y + reach * math.sin(angle))])
    hit = shapely.intersection(ray, shapely.union_all(shapes))
    return math.inf if hit.is_empty else float(shapely.distance(shapely.Point(x, y), hit))


@pytest.mark.parametrize("seed", range(4))
def test_ranges_among_random_cells_agree_with_shapely(seed: int) -> None:
    random = np.random.default_rng(seed)
    blocked = random.random((60, 80)) < 0.03
    blocked[30, 40] = False
    distance = clearance(blocked)
    cells = [
        shapely.box(column * CELL_M, row * CELL_M, (column + 1) * CELL_M, (row + 1) * CELL_M)
        for row, column in np.argwhere(blocked)
    ]
    x, y = 40.4 * CELL_M, 30.7 * CELL_M
    edge = shapely.box(0, 0, 4, 3).exterior
    for angle in random.uniform(0, 2 * math.pi, 150):
        met = cast(distance, x, y, math.cos(angle), math.sin(angle), 10.0)
        assert met == pytest.approx(shortest([*cells, edge], x, y, angle, 10.0), abs=1e-6)


def test_a_person_is_seen_as_an_upright_cylinder_in_every_beam_that_meets_it() -> None:
    distance, ranges = field(ROOM), np.zeros(720)
    eye_x, eye_y = 7.0, 1.0
    scan(distance, np.array([PERSON]), eye_x, eye_y, -math.pi, math.pi / 360, 20.0, 0.0, np.zeros(720), ranges)
    disc = shapely.Point(PERSON[:2]).buffer(PERSON[2], quad_segs=256)
    seen = 0
    for beam, met in enumerate(ranges):
        expected = shortest([disc], eye_x, eye_y, -math.pi + beam * math.pi / 360, 3.0)
        if expected < 2.0 and met < math.inf:
            seen += 1
            assert met == pytest.approx(expected, abs=2e-3)
    assert seen == pytest.approx(2 * math.degrees(math.asin(0.25 / 2.0)) * 2, abs=2)


def test_noise_has_the_deviation_asked_for() -> None:
    """The sample deviation of n normal draws lies within 4 / sqrt(2 n) of the true one, practically always."""
    distance, ranges = field(ROOM), np.zeros(181)
    generator = np.random.default_rng(2)
    errors = []
    exact = np.zeros(181)
    scan(distance, np.zeros((0, 3)), *EYE, -1.0, 2.0 / 180, 20.0, 0.0, np.zeros(181), exact)
    for _ in range(100):
        scan(distance, np.zeros((0, 3)), *EYE, -1.0, 2.0 / 180, 20.0, 0.03, generator.standard_normal(181), ranges)
        errors.append((ranges - exact)[np.isfinite(exact)])
    sample = np.concatenate(errors)
    assert sample.std() == pytest.approx(0.03, rel=4 / math.sqrt(2 * len(sample)))
    assert abs(sample.mean()) < 4 * 0.03 / math.sqrt(len(sample))


@pytest.mark.parametrize("seed", range(4))
def test_overlap_of_the_outline_with_cells_agrees_with_shapely(seed: int) -> None:
    random = np.random.default_rng(seed)
    blocked = random.random((40, 40)) < 0.02
    cells = shapely.union_all(
        [shapely.box(c * CELL_M, r * CELL_M, (c + 1) * CELL_M, (r + 1) * CELL_M) for r, c in np.argwhere(blocked)]
    )
    outline = np.array([(0.3, -0.1), (0.2, 0.2), (-0.25, 0.15), (-0.2, -0.2)])
    covered = 0
    for x, y, heading in random.uniform((0.4, 0.4, -3.0), (1.6, 1.6, 3.0), (150, 3)):
        shape = shapely.affinity.translate(
            shapely.affinity.rotate(shapely.Polygon(outline), heading, origin=(0, 0), use_radians=True), x, y
        )
        expected = shapely.intersection(shape, cells).area > 1e-9
        covered += expected
        assert covers_solid(blocked, outline, x, y, heading) == expected
    assert 10 < covered < 140


def test_the_gap_between_outline_and_a_point_agrees_with_shapely() -> None:
    random = np.random.default_rng(3)
    outline = np.array([(0.3, -0.1), (0.2, 0.2), (-0.25, 0.15), (-0.2, -0.2)])
    shape = shapely.Polygon(outline)
    for x, y in random.uniform(-0.6, 0.6, (200, 2)):
        point = shapely.Point(x, y)
        expected = -shape.exterior.distance(point) if shape.contains(point) else shape.distance(point)
        assert gap(outline, 0.0, 0.0, 0.0, x, y) == pytest.approx(expected, abs=1e-12)


def test_bearings_are_those_of_the_arc_tangent() -> None:
    """Polynomial 4.4.49 of Abramowitz and Stegun, Handbook of Mathematical Functions, 1964: off by 1e-5 at most."""
    random = np.random.default_rng(4)
    for x, y in [*random.normal(size=(2000, 2)), (1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0), (0.0, 0.0)]:
        assert bearing_of(y, x) == pytest.approx(math.atan2(y, x), abs=1.2e-5)
