"""The raster of a floor: walls, solids, doors, and the room a footprint needs."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely import Point as ShapelyPoint
from shapely import Polygon

from runner.site.floor import (
    cell_of,
    center_of,
    circumscribed_radius,
    clearance,
    doors_shut_at,
    footprint_free,
    inscribed_radius,
    rasterize,
)
from runner.site.raster import polygon_cells
from runner.site.routes import regions
from runner.site.values import CELL_M, Door, Pose, Site, Solid, Wall

CART = ((0.4, 0.25), (-0.3, 0.25), (-0.3, -0.25), (0.4, -0.25))
COORDINATE = st.floats(0.3, 3.7)


def two_rooms(thickness: float = 0.1, shut: tuple[tuple[float, float], ...] = ()) -> Site:
    """A floor of 4 x 3 m, cut in two by a wall with a door of 1 m in its middle."""
    return Site(
        name="two rooms",
        width=4.0,
        height=3.0,
        walls=(Wall(((2.0, 0.0), (2.0, 3.0)), thickness),),
        solids=(Solid(((0.5, 0.5), (1.0, 0.5), (1.0, 1.0), (0.5, 1.0))),),
        doors=(Door("middle", (2.0, 1.0), (2.0, 2.0), 0.05, shut),),
        places=(),
    )


def test_a_floor_has_a_cell_for_every_five_centimeters() -> None:
    assert rasterize(two_rooms()).shape == (60, 80)


def test_a_door_cuts_its_opening_out_of_the_wall_it_stands_in() -> None:
    floor = rasterize(two_rooms())
    assert not floor.solid[20:40, 39:41].any()
    assert floor.solid[:20, 39:41].all()
    assert floor.solid[40:, 39:41].all()


def test_a_shut_door_parts_the_rooms_and_an_open_one_joins_them() -> None:
    floor = rasterize(two_rooms())
    left, right = cell_of((1.5, 1.5)), cell_of((3.0, 1.5))
    opened, shut = regions(~floor.blocked()), regions(~floor.blocked(["middle"]))
    assert opened[left] == opened[right]
    assert shut[left] != shut[right]


def test_asking_for_an_unknown_door_is_a_key_error() -> None:
    with pytest.raises(KeyError):
        rasterize(two_rooms()).blocked(["back"])


def test_blocked_cells_are_a_copy() -> None:
    floor = rasterize(two_rooms())
    floor.blocked()[:] = True
    assert not floor.solid.all()


def test_a_solid_covers_exactly_its_cells() -> None:
    floor = rasterize(two_rooms())
    assert floor.solid[10:20, 10:20].all()
    assert floor.solid[:, :39].sum() == 100


@settings(max_examples=60, deadline=None)
@given(
    start=st.tuples(st.just(0.0), COORDINATE),
    end=st.tuples(st.just(4.0), COORDINATE),
    thickness=st.floats(0.001, 0.3),
)
def test_no_wall_is_so_thin_or_slanted_that_a_route_slips_through(
    start: tuple[float, float], end: tuple[float, float], thickness: float
) -> None:
    floor = rasterize(Site("hall", 4.0, 4.0, (Wall((start, end), thickness),), (), (), ()))
    numbers = regions(~floor.blocked())
    assert numbers[0, 0] != numbers[-1, 0]
    assert numbers[0, -1] != numbers[-1, -1]


@settings(max_examples=60, deadline=None)
@given(corners=st.lists(st.tuples(COORDINATE, COORDINATE), min_size=3, max_size=3))
def test_a_polygon_covers_the_cells_whose_centers_it_holds_and_few_others(corners: list[tuple[float, float]]) -> None:
    polygon = Polygon(corners)
    covered = {(int(row), int(column)) for row, column in polygon_cells(corners, (80, 80))}
    for row in range(80):
        for column in range(80):
            center = ShapelyPoint(*center_of((row, column)))
            if polygon.contains(center):
                assert (row, column) in covered
            elif (row, column) in covered:
                assert polygon.distance(center) <= CELL_M / 2.0


def test_doors_are_shut_in_their_hours_over_midnight_too() -> None:
    site = two_rooms(shut=((22 * 3600.0, 6 * 3600.0),))
    assert [doors_shut_at(site, hour * 3600.0) for hour in (21.9, 22, 3, 6)] == [(), ("middle",), ("middle",), ()]


@given(row=st.integers(-5, 500), column=st.integers(-5, 900))
def test_the_center_of_a_cell_lies_in_it(row: int, column: int) -> None:
    assert cell_of(center_of((row, column))) == (row, column)


def test_outside_the_floor_counts_as_blocked() -> None:
    free = clearance(np.zeros((21, 41), dtype=np.bool_))
    assert free[0, 20] == pytest.approx(CELL_M)
    assert free[10, 20] == pytest.approx(11 * CELL_M)


def test_radii_of_a_footprint_are_to_its_nearest_edge_and_its_farthest_corner() -> None:
    assert inscribed_radius(CART) == pytest.approx(0.25)
    assert circumscribed_radius(CART) == pytest.approx(math.hypot(0.4, 0.25))
    assert inscribed_radius([(1.0, 0.0), (2.0, 0.0), (2.0, 1.0)]) == 0.0


def test_a_footprint_fits_a_gap_straight_on_and_not_across() -> None:
    site = Site("gap", 4.0, 4.0, (Wall(((0, 2), (1.7, 2)), 0.2), Wall(((2.3, 2), (4, 2)), 0.2)), (), (), ())
    blocked = rasterize(site).blocked()
    assert footprint_free(blocked, CART, Pose(2.0, 2.0, math.pi / 2.0))
    assert not footprint_free(blocked, CART, Pose(2.0, 2.0, 0.0))


@pytest.mark.parametrize(("x", "free"), [(0.31, True), (0.28, False), (3.59, True), (3.62, False), (9.0, False)])
def test_a_footprint_stays_on_the_floor(x: float, free: bool) -> None:
    assert footprint_free(np.zeros((80, 80), dtype=np.bool_), CART, Pose(x, 2.0, 0.0)) is free
