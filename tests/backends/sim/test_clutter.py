"""What is left about and what stands elsewhere than the map has it: rates, hours, low things, furniture."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np
import pytest

from runner.site.floor import cell_of, clearance
from runner.site.values import Carton, Clutter, Conditions, Pose, Solid
from tests.backends.sim.support import HALL, TWO_ROOMS, Drive, start

HOUR = 3600.0
FAR_CORNER = Pose(13.0, 1.0, 0.0)


def lying(drive: Drive) -> set[tuple[float, float, bool]]:
    """Where what lies about has its middle, and whether it is low."""
    laid = drive.simulator.world._laid
    return {(*one.carton.at, one.carton.low) for one in laid if one.down_at is not None and not one.gone}


def minutes(drive: Drive, count: int, every: float = 10.0) -> Iterator[float]:
    for turn in range(1, round(count * 60.0 / every) + 1):
        drive.until(turn * every)
        yield turn * every


def blocked_at(field: np.ndarray[tuple[int, ...], np.dtype[np.bool_]], x: float, y: float) -> bool:
    return bool(field[cell_of((x, y))])


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_clutter_comes_at_its_rate_and_goes_again(seed: int) -> None:
    clutter = Clutter(per_hour=60.0, stays_s=120.0, low=0.5)
    drive = start(TWO_ROOMS, FAR_CORNER, seed=seed, conditions=Conditions(clutter=(clutter,)))
    seen: set[tuple[float, float, bool]] = set()
    counts = []
    for _ in minutes(drive, 60):
        here = lying(drive)
        seen |= here
        counts.append(len(here))
    assert 30 <= len(seen) <= 85  # 60 come on average; what stays for less than 10 s is not counted here
    assert 0.8 < np.mean(counts[30:]) < 3.5  # 2 lie about on average
    assert 0.25 < np.mean([low for _, _, low in seen]) < 0.75


def test_nothing_is_put_on_a_place_or_on_the_robot() -> None:
    clutter = Clutter(per_hour=300.0, stays_s=60.0)
    drive = start(TWO_ROOMS, FAR_CORNER, conditions=Conditions(clutter=(clutter,)))
    seen: set[tuple[float, float, bool]] = set()
    for _ in minutes(drive, 20):
        seen |= lying(drive)
    spots = [(place.pose.x, place.pose.y) for place in TWO_ROOMS.places] + [(FAR_CORNER.x, FAR_CORNER.y)]
    assert len(seen) > 40
    assert all(math.dist((x, y), spot) >= 1.2 for x, y, _ in seen for spot in spots)


def test_some_of_it_is_moved_elsewhere_before_it_goes() -> None:
    clutter = Clutter(per_hour=20.0, stays_s=600.0, moved=1.0)
    drive = start(TWO_ROOMS, FAR_CORNER, conditions=Conditions(clutter=(clutter,)))
    sizes: dict[tuple[float, float], set[tuple[float, float]]] = {}
    for _ in minutes(drive, 40):
        for one in drive.simulator.world._laid:
            if one.down_at is not None:
                sizes.setdefault(one.carton.size, set()).add(one.carton.at)
    assert max(map(len, sizes.values())) == 2
    assert sum(len(spots) == 2 for spots in sizes.values()) >= 3


def test_outside_its_hours_nothing_is_put_down() -> None:
    clutter = Clutter(per_hour=300.0, stays_s=20.0, hours=((18.0 * HOUR + 600.0, 18.0 * HOUR + 1200.0),))
    drive = start(TWO_ROOMS, FAR_CORNER, conditions=Conditions(clutter=(clutter,)))
    counts = {second: len(lying(drive)) for second in minutes(drive, 30)}
    assert not any(count for second, count in counts.items() if second < 600.0)
    assert any(count for second, count in counts.items() if 650.0 < second < 1200.0)
    assert counts[1800.0] == 0


def test_a_low_thing_stands_on_the_floor_and_below_the_eye() -> None:
    low, tall = Carton((5.0, 4.0), (0.4, 0.4), 2.0, 20.0, low=True), Carton((8.0, 4.0), (0.4, 0.4), 5.0, 15.0)
    drive = start(HALL, Pose(2.0, 4.0, 0.0), cartons=[low, tall])
    world = drive.simulator.world
    assert world.sight is world.distance
    drive.until(10.0)
    assert blocked_at(world.blocked, 5.0, 4.0)
    assert blocked_at(world.blocked, 8.0, 4.0)
    assert world.sight[cell_of((5.0, 4.0))] > 1.0
    assert world.sight[cell_of((8.0, 4.0))] == 0.0
    seen_over = world.blocked.copy()
    seen_over[60:100, 90:110] = False
    np.testing.assert_array_equal(world.sight, np.minimum(clearance(seen_over), np.float32(2.0)))
    drive.until(17.0)
    assert world.sight[cell_of((8.0, 4.0))] > 1.0
    drive.until(21.0)
    assert world.sight is world.distance


def test_furniture_may_be_missing_or_extra_and_the_map_does_not_know() -> None:
    table = TWO_ROOMS.solids[0]
    trolley = Solid(((9.0, 4.0), (9.5, 4.0), (9.5, 4.5), (9.0, 4.5)))
    drive = start(TWO_ROOMS, FAR_CORNER, conditions=Conditions(missing=(table,), extra=(trolley,)))
    world, known = drive.simulator.world, drive.simulator.memory.known
    assert not blocked_at(world.blocked, 3.0, 7.0)
    assert known[cell_of((3.0, 7.0))] == 0.0
    assert blocked_at(world.blocked, 9.25, 4.25)
    assert known[cell_of((9.25, 4.25))] > 1.0
