"""The floor in characters."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from runner.screen.floor_dots import fit, furniture_dots, standing, wall_dots
from runner.screen.floor_drawing import FloorDrawing
from runner.screen.ink import ASCII, DOTTED, Glyphs, Ink
from runner.site.values import Place, Pose, Site, Solid, Wall
from tests.screen.scripted import MOVING, RECOVERING, cart, clinic


def _drawing(columns: int, rows: int, glyphs: Glyphs, site: Site | None = None) -> FloorDrawing:
    drawing = FloorDrawing(site or clinic(), cart(), glyphs)
    drawing.resize(columns, rows)
    return drawing


def _text(drawing: FloorDrawing) -> list[str]:
    return ["".join(char for char, _ in row) for row in drawing.still]


def _room(width: float, height: float) -> Site:
    corners = ((0.0, 0.0), (width, 0.0), (width, height), (0.0, height), (0.0, 0.0))
    return Site(
        "Room", width, height, (Wall(corners, 0.15),), (), (), (Place("middle", Pose(width / 2, height / 2, 0)),)
    )


@given(columns=st.integers(10, 160), rows=st.integers(4, 60), width=st.floats(3, 60), height=st.floats(3, 60))
@settings(max_examples=40, deadline=None)
def test_the_outer_wall_is_one_unbroken_frame_of_the_right_aspect(
    columns: int, rows: int, width: float, height: float
) -> None:
    site = _room(width, height)
    scale = fit(site, columns, rows)
    dots = wall_dots(standing(site), scale)
    ys, xs = np.nonzero(dots)
    top, bottom, left, right = ys.min(), ys.max(), xs.min(), xs.max()
    assert dots[top, left : right + 1].all()
    assert dots[bottom, left : right + 1].all()
    assert dots[top : bottom + 1, left].all()
    assert dots[top : bottom + 1, right].all()
    assert abs((right - left) - width * scale.dots_per_meter) <= 2
    assert abs((bottom - top) - height * scale.dots_per_meter) <= 2


@pytest.mark.parametrize("columns", [37, 54, 87, 140])
def test_every_door_is_an_opening_in_the_walls(columns: int) -> None:
    site = clinic()
    scale = fit(site, columns, columns)
    dots = wall_dots(standing(site), scale)
    for door in site.doors:
        row, column = scale.dot(((door.start[0] + door.end[0]) / 2, door.start[1]))
        assert not dots[row - 1 : row + 2, column].any(), door.name


@pytest.mark.parametrize(("columns", "rows"), [(37, 12), (54, 15), (87, 27), (150, 43)])
@pytest.mark.parametrize("glyphs", [ASCII, DOTTED], ids=["ascii", "dots"])
def test_every_place_has_its_mark_and_a_name(columns: int, rows: int, glyphs: Glyphs) -> None:
    drawing = _drawing(columns, rows, glyphs)
    text = "\n".join(_text(drawing))
    assert sum(cell == (glyphs.place, Ink.PLACE) for row in drawing.still for cell in row) >= len(clinic().places)
    assert all(place.name[:3] in text for place in clinic().places)
    drawing.aim("records")
    assert "records" in "\n".join(_text(drawing))
    assert sum(cell == (glyphs.goal, Ink.GOAL) for row in drawing.still for cell in row) == 1


def test_ascii_drawings_are_ascii() -> None:
    drawing = _drawing(87, 27, ASCII)
    moving = drawing.moving(RECOVERING)
    assert all(char.isascii() for row in drawing.still for char, _ in row)
    assert all(char.isascii() for char, _ in moving.values())


@pytest.mark.parametrize(
    ("degrees", "dotted", "plain"), [(0, "→", ">"), (90, "↑", "^"), (180, "←", "<"), (-90, "↓", "v")]
)
def test_the_robot_points_where_it_heads(degrees: float, dotted: str, plain: str) -> None:
    for glyphs, expected in ((DOTTED, dotted), (ASCII, plain)):
        view = replace(MOVING, pose=Pose(20.0, 12.5, math.radians(degrees)), obstacles=())
        robots = [char for char, ink in _drawing(54, 15, glyphs).moving(view).values() if ink is Ink.ROBOT]
        assert robots == [expected]


def test_the_outline_of_the_robot_is_drawn_once_it_is_large_enough() -> None:
    cells = _drawing(60, 40, DOTTED, _room(6.0, 6.0)).moving(replace(MOVING, pose=Pose(3.0, 3.0, 0.0), route=()))
    assert sum(ink is Ink.ROBOT for _, ink in cells.values()) > 8


def test_what_is_sensed_and_the_route_are_told_apart_from_walls() -> None:
    cells = _drawing(54, 15, DOTTED).moving(MOVING)
    inks = {ink for _, ink in cells.values()}
    assert inks == {Ink.ROUTE, Ink.SENSED, Ink.ROBOT}
    assert {char for char, ink in cells.values() if ink is Ink.SENSED} == {DOTTED.sensed}


def test_points_off_the_floor_do_no_harm() -> None:
    view = replace(MOVING, pose=Pose(-50.0, 900.0, 0.0), route=((-9.0, -9.0), (99.0, 99.0)), obstacles=((1e6, -1e6),))
    assert {ink for _, ink in _drawing(54, 15, DOTTED).moving(view).values()} == {Ink.ROUTE}


def test_furniture_is_lighter_than_a_wall_and_a_thin_solid_is_a_wall() -> None:
    table = Solid(((2.0, 2.0), (4.0, 2.0), (4.0, 3.0), (2.0, 3.0)))
    partition = Solid(((1.0, 4.5), (5.0, 4.5), (5.0, 4.75), (1.0, 4.75)))
    site = replace(_room(6.0, 6.0), solids=(table, partition))
    scale = fit(site, 60, 30)
    walls, furniture = wall_dots(standing(site), scale), furniture_dots(standing(site), scale)
    (top, left), (bottom, right) = scale.dot((2.1, 2.9)), scale.dot((3.9, 2.1))
    assert 0.4 <= furniture[top:bottom, left:right].mean() <= 0.6
    assert not walls[top:bottom, left:right].any()
    row, first = scale.dot((1.1, 4.625))
    assert walls[row, first : scale.dot((4.9, 4.625))[1]].all()


def test_a_post_smaller_than_a_dot_is_not_lost_to_the_pattern() -> None:
    for shift in range(4):
        x = 10.0 + 0.5 * shift
        site = replace(_room(30.0, 30.0), solids=(Solid(((x, 10.0), (x + 0.5, 10.0), (x + 0.5, 10.5), (x, 10.5))),))
        assert furniture_dots(standing(site), fit(site, 30, 15)).any()
