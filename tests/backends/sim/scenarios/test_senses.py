"""What the robot does because of what it sees, sees wrongly, sees late or does not see. Each on three seeds."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from backends.contract import GoalStatus
from runner.site.values import (
    Bystander,
    Carton,
    Conditions,
    Filters,
    Place,
    Pose,
    Post,
    RobotDescription,
    Site,
    Solid,
    Sweep,
)
from tests.backends.sim.scenarios.watching import SEEDS, drive_leg
from tests.backends.sim.support import CART, HALL, Drive, box, distance, go, start
from tests.backends.sim.test_trouble import NARROW

ARRIVED, NO_ROUTE = GoalStatus.ARRIVED, GoalStatus.NO_ROUTE
WEST, EAST = Pose(2.0, 4.0, 0.0), Pose(10.0, 4.0, 0.0)

# --- low things ---------------------------------------------------------------------------------------------------

SWEEPING = replace(CART, sweep=Sweep(math.radians(90.0), 60, 3.5, 2.0, 0.02, 0.3))
LOW = Carton((6.0, 4.0), (0.4, 0.4), low=True)


@pytest.mark.parametrize("seed", SEEDS)
def test_a_low_carton_stops_the_robot_that_has_no_sweep(seed: int) -> None:
    drive = start(HALL, WEST, seed=seed, cartons=[LOW])
    leg = drive_leg(drive, 1, EAST, 60.0)
    assert leg.end is None
    assert leg.contacts > 100
    assert drive.simulator.body.pose.x == pytest.approx(5.8 - 0.35, abs=0.02)
    assert drive.simulator.memory.count == 0, "it never saw what it stands at"


@pytest.mark.parametrize("seed", SEEDS)
def test_with_its_sweep_it_sees_the_low_carton_and_goes_round(seed: int) -> None:
    drive = start(HALL, WEST, seed=seed, cartons=[LOW], robot=SWEEPING)
    leg = drive_leg(drive, 1, EAST, 60.0)
    assert (leg.end, leg.contacts) == (ARRIVED, 0)


@pytest.mark.parametrize("seed", SEEDS)
def test_the_lidar_looks_over_a_low_carton_and_takes_nothing_of_it_away(seed: int) -> None:
    drive = start(HALL, Pose(4.0, 4.0, 0.0), seed=seed, cartons=[LOW], robot=SWEEPING)
    drive_leg(drive, 1, Pose(4.6, 4.0, 0.0), 30.0)
    seen = drive.simulator.memory.count
    drive.until(drive.simulator.clock.now() + 60.0)
    assert drive.simulator.memory.count >= seen > 3


# --- a crowd that leaves ------------------------------------------------------------------------------------------

CROWD_S = 60.0
AWAY = Pose(6.0, 6.9, math.pi / 2.0)
"""Where nobody goes when the crowd breaks up."""
RING = tuple(
    Bystander((6.0 + 0.85 * math.cos(angle), 4.0 + 0.85 * math.sin(angle)), until_s=CROWD_S)
    for angle in (math.tau * part / 6.0 for part in range(6))
)


def freed_after(seed: int, clears: bool) -> float:
    """Seconds from when the crowd walks off until the robot is half a meter away."""
    drive = start(HALL, Pose(6.0, 4.0, 0.0), seed=seed, conditions=Conditions("crowd", 0.0, bystanders=RING))
    number = 0
    while drive.simulator.clock.now() < CROWD_S + 120.0:
        number += 1
        go(drive, number, AWAY)
        over = drive.simulator.clock.now() + 4.0
        while drive.simulator.clock.now() < over:
            drive.until(drive.simulator.clock.now() + 0.1)
            if distance(drive.simulator.body.pose, Pose(6.0, 4.0, 0.0)) > 0.5:
                return drive.simulator.clock.now() - CROWD_S
        if clears and drive.simulator.clock.now() > CROWD_S + 3.0:
            drive.simulator.clear(1000 + number, 3.0)
    raise AssertionError("It never got away.")


@pytest.mark.parametrize("seed", SEEDS)
def test_a_robot_hemmed_in_stays_stuck_for_a_while_after_the_crowd_left_unless_it_clears(seed: int) -> None:
    slow, quick = freed_after(seed, clears=False), freed_after(seed, clears=True)
    assert slow > 25.0
    assert 3.0 < quick < 15.0


# --- a blind corner -----------------------------------------------------------------------------------------------

CORNER_X, CORNER_Y = 10.0, 2.6


def corner(inner_ends_at: float) -> Site:
    """A corridor 1.6 m wide along x that turns north at x = 10; its inner wall is solid from there westward."""
    solids = (
        Solid(((0.0, 0.0), (14.0, 0.0), (14.0, 1.0), (0.0, 1.0))),
        Solid(((11.6, 1.0), (14.0, 1.0), (14.0, 14.0), (11.6, 14.0))),
        Solid(((0.0, CORNER_Y), (inner_ends_at, CORNER_Y), (inner_ends_at, 14.0), (0.0, 14.0))),
    )
    places = (Place("west", Pose(2.0, 1.8, 0.0)), Place("north", Pose(10.8, 12.0, math.pi / 2.0)))
    return Site("corner", 14.0, 14.0, (box(14.0, 14.0),), solids, (), places)


QUICK = replace(CART, speed=1.5)


def speeds_round(site: Site, seed: int) -> list[tuple[float, float, float]]:
    """(x, y, speed) of every tick of a drive round the corner."""
    drive = start(site, site.places[0].pose, seed=seed, robot=QUICK)
    go(drive, 1, site.places[1].pose, 1.5)
    rows: list[tuple[float, float, float]] = []
    while drive.until_end(round(len(rows) * 0.1 + 0.1, 1)) is None:
        x, y, _ = drive.simulator.body.place.tolist()
        rows.append((x, y, drive.simulator.body.drive.speed))
        assert len(rows) < 600
    return rows


def in_sight(x: float, y: float, place: tuple[float, float, float]) -> bool:
    """By plane geometry: whether the line to a place passes the corner on its free side."""
    to_x, to_y = place[0] - x, place[1] - y
    return place[0] < CORNER_X or to_y * (CORNER_X - x) <= to_x * (CORNER_Y - y)


@pytest.mark.parametrize("seed", SEEDS)
def test_it_slows_before_a_blind_corner_so_that_it_could_stop_in_what_it_sees(seed: int) -> None:
    rows = speeds_round(corner(CORNER_X), seed)
    assert max(speed for x, _, speed in rows if x < 7.0) == pytest.approx(1.5)
    slowest = min(speed for x, y, speed in rows if x > 8.0 and y < 2.4)
    assert slowest < 1.0
    for index, (x, y, speed) in enumerate(rows):
        way = 0.0
        for before, place in zip(rows[index:], rows[index + 1 :], strict=False):
            if not in_sight(x + 0.2, y, place):
                break
            way += math.dist(before[:2], place[:2])
        else:
            continue
        if x < CORNER_X - 0.5:
            assert speed <= math.sqrt(2.0 * CART.acceleration * way), (x, y, speed, way)


@pytest.mark.parametrize("seed", SEEDS)
def test_it_does_not_slow_where_it_sees_round_the_corner(seed: int) -> None:
    blind, open_floor = speeds_round(corner(CORNER_X), seed), speeds_round(corner(3.5), seed)
    assert len(open_floor) < len(blind)
    assert min(speed for x, y, speed in open_floor if 6.0 < x < 9.0) > 1.2


# --- filters ------------------------------------------------------------------------------------------------------

POSTS = (Post((0.28, 0.2), 0.03), Post((0.28, -0.2), 0.03))


@pytest.mark.parametrize("seed", SEEDS)
def test_without_its_filter_the_robot_takes_its_own_posts_for_obstacles_and_does_not_get_away(seed: int) -> None:
    filtered, bare = (
        drive_leg(start(HALL, WEST, seed=seed, robot=replace(CART, posts=POSTS, filters=one)), 1, EAST, 60.0)
        for one in (Filters(), Filters(own_body=False))
    )
    assert (filtered.end, filtered.contacts) == (ARRIVED, 0)
    assert bare.end is None
    assert bare.contacts == 0, "nothing real was in its way"


UNEVEN = Conditions("uneven", 0.0, uneven_floor=0.015)


def legs_along(seed: int, filters: Filters) -> list[GoalStatus | None]:
    """A low lidar goes up and down an empty corridor with an uneven floor, with a stop after each leg."""
    robot = replace(CART, lidar=replace(CART.lidar, height=0.1), filters=filters)
    drive = start(NARROW, Pose(2.0, 2.0, 0.0), seed=seed, robot=robot, conditions=UNEVEN)
    ends: list[GoalStatus | None] = []
    stops = [6.0 + 4.5 * number for number in range(7)]
    for x in stops + stops[-2::-1] + stops[1:]:
        ends.append(drive_leg(drive, len(ends) + 1, Pose(x, 2.0, 0.0), 40.0).end)
        if ends[-1] is not ARRIVED:
            break
        drive.until(drive.simulator.clock.now() + 5.0)
    return ends


@pytest.mark.parametrize("seed", SEEDS)
def test_without_its_filter_the_floor_before_a_nodding_robot_blocks_the_corridor(seed: int) -> None:
    assert legs_along(seed, Filters()) == [ARRIVED] * 19
    assert legs_along(seed, Filters(floor_returns=False))[-1] is not ARRIVED


DEEP_DOOR = Site(
    "door to a hall", 24.0, 20.0, (box(24.0, 20.0),),
    (
        Solid(((0.0, 0.0), (24.0, 0.0), (24.0, 1.1), (0.0, 1.1))),
        Solid(((0.0, 3.1), (10.0, 3.1), (10.0, 3.8), (0.0, 3.8))),
        Solid(((11.0, 3.1), (24.0, 3.1), (24.0, 3.8), (11.0, 3.8))),
    ),
    (), (Place("corridor", Pose(6.0, 2.0, 0.0)), Place("hall", Pose(10.5, 9.0, math.pi / 2.0))),
)  # fmt: skip
"""From a corridor through a thick wall into a hall that is wider than the lidar reaches."""


def legs_through(seed: int, filters: Filters) -> list[GoalStatus | None]:
    """To and fro through the door, up to twenty legs, until one fails. Each beam's light reaches to the next beam's."""
    robot: RobotDescription = replace(
        CART, lidar=replace(CART.lidar, range_max=6.0, beam_width=math.radians(1.5)), filters=filters
    )
    corridor, hall = (place.pose for place in DEEP_DOOR.places)
    drive: Drive = start(DEEP_DOOR, corridor, seed=seed, robot=robot)
    ends: list[GoalStatus | None] = []
    while len(ends) < 20 and ends[-1:] in ([], [ARRIVED]):
        ends.append(drive_leg(drive, len(ends) + 1, corridor if len(ends) % 2 else hall, 60.0).end)
    return ends


@pytest.mark.parametrize("seed", SEEDS)
def test_without_its_filter_shadow_points_off_a_jamb_close_the_door_for_good(seed: int) -> None:
    assert legs_through(seed, Filters()) == [ARRIVED] * 20
    assert legs_through(seed, Filters(shadow_points=False))[-1] is not ARRIVED
