"""What the lidar gets wrong, when it comes, and what the filters leave of it."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from backends.sim.outline import outline_of
from backends.sim.sensing import Scan, Scanner
from runner.site.floor import clearance
from runner.site.values import CELL_M, Filters, Lidar, Pose, Post, RobotDescription
from tests.backends.sim.support import CART

HERE = Pose(2.0, 3.0, 0.0)
NOBODY = np.zeros((0, 3))
LIDAR = Lidar(math.radians(180.0), 181, 10.0, 10.0, 0.0)
BARE = Filters(shadow_points=False, own_body=False, floor_returns=False)


def room(*boxes: tuple[float, float, float, float]) -> NDArray[np.float32]:
    """The distance field of a room of 8 x 6 m with boxes (x, y, x, y) in it."""
    blocked = np.zeros((120, 160), dtype=np.bool_)
    for left, low, right, high in boxes:
        blocked[round(low / CELL_M) : round(high / CELL_M), round(left / CELL_M) : round(right / CELL_M)] = True
    return clearance(blocked)


def scanner(robot: RobotDescription, uneven: float = 0.0) -> Scanner:
    generators = [np.random.default_rng(seed) for seed in (1, 2)]
    return Scanner(robot, outline_of(robot.footprint), uneven, 10, *generators)


def scans(
    robot: RobotDescription, field: NDArray[np.float32], count: int = 1, uneven: float = 0.0, step: float = 0.0
) -> NDArray[np.float64]:
    """The ranges of some scans from the same place, one a row; `step` is the way said to be driven between two."""
    eyes, rows = scanner(robot, uneven), []
    for tick in range(count):
        eyes.look(tick, HERE, tick * step, HERE, field, NOBODY, False)
        scan = eyes.deliver(tick, HERE)
        assert scan is not None
        rows.append(scan.ranges.copy())
    return np.array(rows)


def with_lidar(filters: Filters = BARE, posts: tuple[Post, ...] = (), **changes: float) -> RobotDescription:
    return replace(CART, lidar=replace(LIDAR, **changes), filters=filters, posts=posts)  # type: ignore[arg-type]


# --- latency ------------------------------------------------------------------------------------------------------


def test_a_scan_comes_when_its_latency_is_over_and_every_scan_comes() -> None:
    eyes, field, came = scanner(with_lidar(latency=0.3)), room((5.0, 2.0, 5.5, 4.0)), []
    for tick in range(20):
        eyes.look(tick, Pose(2.0 + 0.05 * tick, 3.0, 0.0), 0.0, HERE, field, NOBODY, False)
        scan = eyes.deliver(tick, HERE)
        came.append(None if scan is None else round(float(scan.ranges[90]), 2))
    assert came[:3] == [None] * 3
    assert came[3:] == [pytest.approx(3.0 - 0.05 * tick, abs=0.006) for tick in range(17)]


def test_a_late_scan_is_placed_where_the_robot_was_when_it_was_taken() -> None:
    """By hand: odometry went 1 m ahead and turned left by 90 degrees; now the robot believes to stand at (4, 3) facing
    north, so it was at (4 + 0, 3) - 1 m along east, facing east, and its lidar 0.5 m before it."""
    eyes = scanner(with_lidar(latency=0.1, forward=0.5))
    eyes.look(0, HERE, 0.0, Pose(10.0, 10.0, 0.0), room(), NOBODY, False)
    scan = eyes.deliver(1, Pose(11.0, 10.0, math.pi / 2.0))
    assert scan is not None
    x, y, first = scan.origin(Pose(4.0, 3.0, math.pi / 2.0))
    assert [x, y] == pytest.approx([3.5, 3.0])
    assert first == pytest.approx(-math.pi / 2.0)


def test_a_scan_without_latency_is_placed_where_the_robot_is() -> None:
    scan = Scan(np.zeros(1), -1.0, 0.1, 0.5)
    assert scan.origin(Pose(1.0, 2.0, math.pi / 2.0)) == pytest.approx((1.0, 2.5, math.pi / 2.0 - 1.0))


# --- lost beams, blindness ----------------------------------------------------------------------------------------


def test_the_share_of_lost_beams_is_the_one_asked_for() -> None:
    rows = scans(with_lidar(dropouts=0.05), room(), 200)
    complete = np.isfinite(scans(with_lidar(), room())[0])
    lost = np.isinf(rows[:, complete])
    assert lost.mean() == pytest.approx(0.05, abs=4.0 * math.sqrt(0.05 * 0.95 / lost.size))


def test_a_blind_lidar_gives_no_return_and_says_so() -> None:
    eyes = scanner(with_lidar())
    eyes.look(0, HERE, 0.0, HERE, room(), NOBODY, True)
    scan = eyes.deliver(0, HERE)
    assert scan is not None
    assert scan.blind
    assert np.isinf(scan.ranges).all()


# --- shadow points ------------------------------------------------------------------------------------------------

BEFORE_WALL = room((3.5, 2.0, 3.8, 3.2), (5.0, 0.0, 5.2, 6.0))
"""A box with a free side at y = 3.2, 1.5 m off, and a wall 1.5 m behind its face."""


def between(rows: NDArray[np.float64], nearest: float = 3.7, farthest: float = 4.8) -> NDArray[np.bool_]:
    """Returns at least 0.2 m behind the face of the box and before the wall, and not from the side walls."""
    bearings = np.arange(rows.shape[1]) * math.pi / 180.0 - math.pi / 2.0
    x, off = HERE.x + rows * np.cos(bearings), np.abs(rows * np.sin(bearings))
    result: NDArray[np.bool_] = (x > nearest) & (x < farthest) & (off < 1.5)
    return result


def test_a_beam_that_meets_an_edge_returns_something_between_the_surfaces() -> None:
    wide = math.radians(1.0)
    mixed = between(scans(with_lidar(beam_width=wide), BEFORE_WALL, 100))
    assert mixed.any(axis=0).sum() == 2, "one beam at each edge of the box"
    assert 0.3 < mixed.any(axis=1).mean() < 0.95
    assert not between(scans(with_lidar(), BEFORE_WALL, 10)).any(), "a beam with no width sees one surface only"


def test_surfaces_too_far_apart_give_two_echoes_and_no_mixture() -> None:
    far = room((3.5, 2.0, 3.8, 3.2), (7.5, 0.0, 7.7, 6.0))
    assert not between(scans(with_lidar(beam_width=math.radians(1.0)), far, 50), 3.7, 7.3).any()


def test_the_filter_drops_shadow_points_and_keeps_the_surfaces() -> None:
    wide = math.radians(1.0)
    filtered = scans(with_lidar(Filters(), beam_width=wide), BEFORE_WALL, 100)
    exact = scans(with_lidar(), BEFORE_WALL)[0]
    assert not between(filtered).any()
    kept = np.logical_and.reduce(np.isfinite(filtered))
    assert kept.sum() > 0.9 * np.isfinite(exact).sum()
    face = np.isclose(exact, 1.5 / np.cos(np.radians(np.arange(181) - 90.0)), atol=1e-6)
    assert face.sum() > 20
    assert kept[face].all(), "the near surface keeps every beam"


# --- its own body -------------------------------------------------------------------------------------------------


def test_a_post_is_met_at_its_own_distance_and_the_filter_takes_it_out() -> None:
    post = (Post((0.2, 0.2), 0.04),)
    seen = scans(with_lidar(posts=post), room())[0]
    met = seen < 0.4
    bearings = np.radians(np.arange(181) - 90.0)[met]
    assert seen[met].min() == pytest.approx(math.hypot(0.2, 0.2) - 0.02, abs=1e-3)
    assert np.abs(bearings - math.pi / 4.0).max() <= math.asin(0.02 / math.hypot(0.2, 0.2))
    filtered = scans(with_lidar(Filters(), posts=post), room())[0]
    assert np.isinf(filtered[met]).all()
    np.testing.assert_array_equal(filtered[~met], scans(with_lidar(), room())[0][~met])


def test_behind_its_own_post_the_robot_does_not_say_that_it_saw() -> None:
    eyes = scanner(with_lidar(Filters(), posts=(Post((0.2, 0.2), 0.04),)))
    eyes.look(0, HERE, 0.0, HERE, room(), NOBODY, False)
    scan = eyes.deliver(0, HERE)
    assert scan is not None
    assert (scan.sight < 0.0).sum() == (scan.sight[125:145] < 0.0).sum() > 3


# --- the floor ----------------------------------------------------------------------------------------------------


def test_on_an_uneven_floor_the_nodding_robot_meets_the_floor_where_geometry_says() -> None:
    """A lidar 0.15 m above the floor, nose down by an angle a, meets it at 0.15 m / a straight ahead."""
    robot, eyes, field = with_lidar(height=0.15), scanner(with_lidar(height=0.15), 0.01), room((7.0, 0.0, 7.2, 6.0))
    assert robot.filters == BARE
    met = 0
    for tick in range(300):
        eyes.look(tick, HERE, 0.08 * tick, HERE, field, NOBODY, False)
        scan = eyes.deliver(tick, HERE)
        assert scan is not None
        nod = eyes._nod._now
        expected = min(0.15 / nod, 5.0) if nod > 0.0 else 5.0
        assert scan.ranges[90] == pytest.approx(expected, abs=1e-6)
        met += expected < 5.0
    assert met > 5


def test_the_nod_has_the_spread_of_two_spots_a_robots_length_apart() -> None:
    eyes = scanner(with_lidar(height=0.15), 0.01)
    nods = np.array([eyes._nod.at(0.5 * step) for step in range(4000)])
    assert nods.std() == pytest.approx(math.sqrt(2.0) * 0.01 / 0.7, rel=0.05)
    assert eyes._nod.at(0.5 * 3999) == nods[-1], "a robot that stands does not nod"


def test_the_filter_takes_the_floor_out_and_leaves_what_stands_nearer() -> None:
    field = room((4.0, 2.6, 4.2, 3.4), (7.0, 0.0, 7.2, 6.0))
    rows = scans(with_lidar(Filters(), height=0.1), field, 400, 0.01, 0.08)
    ahead = rows[:, 90]
    assert (np.isinf(ahead) | (np.abs(ahead - 2.0) < 1e-6)).all()
    assert (np.abs(ahead - 2.0) < 1e-6).mean() > 0.8
    bare = scans(with_lidar(height=0.1), field, 400, 0.01, 0.08)[:, 70]
    wall = 5.0 / math.cos(math.radians(20.0))
    assert (bare < wall - 0.1).sum() > 10
    believed = rows[:, 70][np.isfinite(rows[:, 70])]
    assert np.abs(believed - wall).max() < 1e-6


def test_a_lidar_whose_height_is_not_given_never_meets_the_floor() -> None:
    field = room((7.0, 0.0, 7.2, 6.0))
    np.testing.assert_array_equal(
        scans(with_lidar(), field, 50, 0.02, 0.08), np.tile(scans(with_lidar(), field), (50, 1))
    )
