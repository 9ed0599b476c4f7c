"""What the robot remembers: hits build it up, passing beams that come back wear it down, clearing drops it."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from backends.sim.memory import PAINT_M, Memory
from backends.sim.outline import outline_of
from backends.sim.sensing import Scan
from runner.site.floor import clearance
from runner.site.values import CELL_M, Lidar, Pose
from tests.backends.sim.support import CART

LIDAR = Lidar(math.radians(180.0), 181, 10.0, 10.0, 0.0)
OUTLINE = outline_of(CART.footprint)
STANDING = Pose(2.0, 3.025, 0.0)
MIDDLE = 90


def memory() -> Memory:
    """Of a floor of 8 x 6 m with nothing on it."""
    return Memory(np.zeros((120, 160), dtype=np.bool_), OUTLINE, LIDAR)


def scan_of(ranges: dict[int, float]) -> Scan:
    """A scan with these returns and none else."""
    filled = np.full(181, np.inf)
    for beam, reach in ranges.items():
        filled[beam] = reach
    return Scan(filled, -math.pi / 2, math.pi / 180, 0.0)


def test_a_hit_is_remembered_where_it_was() -> None:
    made = memory()
    made.take(scan_of({MIDDLE: 2.0}), STANDING)
    assert made.count == 1
    [(x, y)] = made.shown(STANDING)
    assert math.hypot(x - 4.0, y - 3.025) <= CELL_M


def test_a_beam_that_comes_back_from_beyond_takes_evidence_away_scan_by_scan() -> None:
    made = memory()
    for _ in range(3):
        made.take(scan_of({MIDDLE: 2.0}), STANDING)
    counts = []
    for _ in range(3):
        made.take(scan_of({MIDDLE: 4.0}), STANDING)
        counts.append(len([one for one in made.shown(STANDING) if one[0] < 4.5]))
    assert counts == [1, 1, 0]


def test_a_beam_that_does_not_come_back_takes_nothing_away() -> None:
    made = memory()
    made.take(scan_of({MIDDLE: 2.0}), STANDING)
    for _ in range(50):
        made.take(scan_of({}), STANDING)
    assert made.count == 1


def test_a_beam_beside_the_cell_or_stopped_before_it_takes_nothing_away() -> None:
    made = memory()
    made.take(scan_of({MIDDLE: 2.0}), STANDING)
    made.take(scan_of({MIDDLE + 4: 4.0, MIDDLE: 1.0}), STANDING)
    assert any(one[0] == pytest.approx(4.0, abs=CELL_M) for one in made.shown(STANDING))


def test_what_stood_long_is_not_remembered_longer_than_the_cap() -> None:
    made = memory()
    for _ in range(2000):
        made.take(scan_of({MIDDLE: 2.0}), STANDING)
    for _ in range(300):
        made.take(scan_of({MIDDLE: 6.0}), STANDING)
    assert made.shown(STANDING) == ()


def test_returns_from_mapped_walls_are_not_remembered() -> None:
    mapped = np.zeros((120, 160), dtype=np.bool_)
    mapped[:, 80] = True
    made = Memory(mapped, OUTLINE, LIDAR)
    for reach in (1.92, 2.0, 2.08):
        made.take(scan_of({MIDDLE: reach}), STANDING)
    assert made.count == 0


def test_clearing_forgets_within_the_radius_and_no_farther() -> None:
    made = memory()
    made.take(scan_of({MIDDLE: 1.0, MIDDLE + 40: 4.0}), STANDING)
    assert made.forget(STANDING, 2.0) == 1
    assert made.count == 1


def test_what_the_robot_itself_stands_on_is_forgotten_in_a_moment() -> None:
    made = memory()
    made.take(scan_of({MIDDLE: 1.0, MIDDLE + 40: 1.0}), STANDING)
    for _ in range(4):
        made.take(scan_of({}), Pose(2.7, 3.025, 0.0))
    assert made.count == 1


def test_no_more_than_64_points_are_shown_and_none_beyond_4_meters() -> None:
    made = memory()
    made.take(scan_of(dict.fromkeys(range(181), 2.4)), STANDING)
    made.take(scan_of({MIDDLE: 4.5}), STANDING)
    points = made.shown(STANDING)
    assert 32 <= len(points) <= 64
    assert all(math.dist(point, (2.0, 3.025)) <= 4.0 for point in points)


@settings(max_examples=40, deadline=None)
@given(
    st.lists(
        st.tuples(st.dictionaries(st.integers(0, 180), st.floats(0.2, 4.9), max_size=40), st.floats(-1.0, 1.0)),
        min_size=1,
        max_size=8,
    ),
    st.floats(0.0, 4.0),
)
def test_the_distance_field_is_always_that_of_map_and_memory_together(
    scans: list[tuple[dict[int, float], float]], radius: float
) -> None:
    mapped = np.zeros((120, 160), dtype=np.bool_)
    mapped[40:44, 50:90] = True
    made = Memory(mapped, OUTLINE, LIDAR)
    for ranges, turned in scans:
        made.take(scan_of(ranges), Pose(2.0, 3.0, turned))
    made.forget(STANDING, radius)
    remembered = np.zeros(mapped.shape, dtype=np.bool_)
    for cell in made._cells[: made.count]:
        remembered[divmod(int(cell), 160)] = True
    assert np.count_nonzero(made._evidence) == made.count
    reach = OUTLINE.outer + PAINT_M
    near = clearance(remembered) if made.count else np.full(mapped.shape, np.inf)
    edge = clearance(np.zeros(mapped.shape, dtype=np.bool_))
    near = np.where(near < edge, near, np.inf)
    expected = np.minimum(clearance(mapped), np.where(near <= reach, near, np.inf))
    np.testing.assert_allclose(made.field, expected, atol=1e-6)
