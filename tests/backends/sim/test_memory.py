"""What the robot remembers: hits build it up, passing beams that come back wear it down, clearing drops it."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from backends.sim.kernels.evidence import CONFIRMED, GLIMPSE
from backends.sim.memory import PAINT_M, Memory, State, surveyed
from backends.sim.outline import outline_of
from backends.sim.sensing import Scan
from runner.site.floor import clearance, rasterize
from runner.site.values import CELL_M, Lidar, Pose, Site, Solid, Sweep
from tests.backends.sim.support import CART, TWO_ROOMS

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
    return Scan(filled, -math.pi / 2, math.pi / 180, 0.0, sight=filled)


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
    for _ in range(CONFIRMED):
        made.take(scan_of({MIDDLE: 2.0}), STANDING)
    for _ in range(200):
        made.take(scan_of({}), STANDING)
    assert made.count == 1


def test_what_was_only_glimpsed_goes_by_itself_after_a_while() -> None:
    made = memory()
    for _ in range(CONFIRMED - 1):
        made.take(scan_of({MIDDLE: 2.0}), STANDING)
    for _ in range(GLIMPSE):
        made.take(scan_of({}), STANDING)
    assert made.count == 1
    made.take(scan_of({}), STANDING)
    assert made.count == 0


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


SPOT = (4.0, 3.025)
"""What a beam of 2 m straight ahead meets."""


def cleared() -> Memory:
    """A memory that had something at the spot and was told to clear."""
    made = memory()
    made.take(scan_of({MIDDLE: 2.0}), STANDING)
    assert made.state(SPOT) is State.OCCUPIED
    assert made.forget(STANDING, 3.0) == 1
    return made


def test_what_was_seen_from_where_the_robot_was_not_is_taken_back_and_leaves_nothing_unseen() -> None:
    made = memory()
    for _ in range(CONFIRMED):
        made.take(scan_of({MIDDLE: 2.0, MIDDLE + 60: 2.5}), STANDING)
    assert made.count == 2
    made.disown(STANDING)
    assert (made.count, made.unseen) == (0, 0)
    assert made.state((4.0, 3.025)) is State.FREE
    made.take(scan_of({}), STANDING)
    assert np.array_equal(made.field, made.known)


def test_what_was_cleared_is_unseen_and_not_free() -> None:
    made = cleared()
    assert made.state(SPOT) is State.UNSEEN
    assert (made.unseen, made.count) == (1, 0)
    assert made.state((3.0, 3.0)) is State.FREE, "only what was remembered there is forgotten"


def test_a_beam_that_comes_back_from_beyond_shows_at_once_that_it_is_free() -> None:
    made = cleared()
    made.take(scan_of({MIDDLE: 4.0}), STANDING)
    assert made.state(SPOT) is State.FREE
    assert made.unseen == 0


def test_beams_that_do_not_come_back_show_it_after_a_second_of_them() -> None:
    made = cleared()
    for number in range(1, 11):
        assert made.state(SPOT) is State.UNSEEN
        made.take(scan_of({}), STANDING)
        assert made.unseen == (0 if number == 10 else 1)
    assert made.state(SPOT) is State.FREE


def test_beams_that_do_not_come_back_show_nothing_farther_than_they_are_trusted() -> None:
    made = memory()
    made.take(scan_of({MIDDLE: 4.9}), STANDING)
    made.forget(STANDING, 6.0)
    for _ in range(50):
        made.take(scan_of({}), Pose(1.0, 3.025, 0.0))
    assert made.unseen == 1


def test_a_blind_scan_shows_nothing() -> None:
    made = cleared()
    for _ in range(50):
        made.take(
            Scan(np.full(181, np.inf), -math.pi / 2, math.pi / 180, 0.0, sight=np.zeros(181), blind=True), STANDING
        )
    assert made.state(SPOT) is State.UNSEEN


def test_what_is_hit_again_is_occupied_again_and_what_stands_before_it_hides_it() -> None:
    made = cleared()
    made.take(scan_of({MIDDLE: 1.0}), STANDING)
    assert made.state(SPOT) is State.UNSEEN
    made.take(scan_of({MIDDLE: 2.0}), STANDING)
    assert made.state(SPOT) is State.OCCUPIED
    assert made.unseen == 0


def test_a_field_without_unseen_space_counts_it_as_solid_and_the_robots_own_does_not() -> None:
    made = cleared()
    row, column = int(SPOT[1] / CELL_M), int(SPOT[0] / CELL_M)
    assert made.without_unseen()[row, column] == 0.0
    assert made.field[row, column] > 1.0
    made.take(scan_of({MIDDLE: 4.0}), STANDING)
    made.forget(STANDING, 0.1)
    assert made.without_unseen() is made.field


def test_floor_that_hangs_together_with_no_place_was_not_surveyed() -> None:
    walls = (Solid(((4.0, 0.0), (4.2, 0.0), (4.2, 6.0), (4.0, 6.0))),)
    mapped = rasterize(Site("two halves", 8.0, 6.0, (), walls, (), ())).blocked()
    made = Memory(mapped, OUTLINE, LIDAR, surveyed(mapped, Site("x", 8.0, 6.0, (), walls, (), ()), STANDING))
    states = [made.state(point) for point in ((2.0, 3.0), (4.1, 3.0), (6.0, 3.0), (9.0, 3.0))]
    assert states == [State.FREE, State.OCCUPIED, State.UNSEEN, State.UNSEEN]


def test_all_rooms_with_a_door_were_surveyed() -> None:
    mapped = rasterize(TWO_ROOMS).blocked()
    assert (surveyed(mapped, TWO_ROOMS, STANDING) == ~mapped).all()


SWEEP = Sweep(math.radians(30.0), 30, 3.5, 2.0)


def swept(made: Memory, reach: float) -> None:
    """Three columns straight ahead, all with the same range."""
    made.take_columns(np.full(3, reach), STANDING.x, STANDING.y, -math.radians(1.0), math.radians(1.0), SWEEP)


def test_what_only_the_sweep_saw_stays_when_the_lidar_looks_over_it() -> None:
    made = memory()
    swept(made, 2.0)
    seen = made.count
    assert seen >= 1
    for _ in range(300):
        made.take(scan_of(dict.fromkeys(range(181), 5.5)), STANDING)
    assert made.count == seen


def test_the_sweep_takes_back_what_it_saw_when_it_meets_only_floor_there() -> None:
    made = memory()
    for _ in range(3):
        swept(made, 2.0)
    counts = []
    for _ in range(3):
        swept(made, SWEEP.range_max + 1.0)
        counts.append(made.count > 0)
    assert counts == [True, True, False]


def test_the_sweep_shows_cleared_floor_to_be_free() -> None:
    made = cleared()
    swept(made, SWEEP.range_max + 1.0)
    assert made.state(SPOT) is State.FREE


def test_what_the_lidar_saw_too_is_the_lidars_to_take_away() -> None:
    made = memory()
    swept(made, 2.0)
    for _ in range(3):
        made.take(scan_of({MIDDLE: 2.0}), STANDING)
    assert made.state(SPOT) is State.OCCUPIED
    for _ in range(40):
        made.take(scan_of({MIDDLE: 4.0}), STANDING)
    assert made.state(SPOT) is State.FREE


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
