"""The floor in characters."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from runner.host.view import FeedLine, Weight
from runner.screen.floor_dots import fit, furniture_dots, standing, wall_dots
from runner.screen.floor_drawing import FloorDrawing
from runner.screen.ink import ASCII, DOTTED, Glyphs, Ink
from runner.screen.recollection import Recollection
from runner.screen.sight import Sight, middle, scale_of
from runner.site.values import Place, Pose, Site, Solid, Wall
from tests.screen.scripted import MOVING, RECOVERING, cart, clinic, driving


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


def test_a_door_is_shut_by_its_known_hours_and_open_again_after_them() -> None:
    drawing = _drawing(54, 15, DOTTED)
    assert not any(ink is Ink.SHUT for row in drawing.still for _, ink in row)
    drawing.tell_time(23 * 3600.0)
    assert {cell for row in drawing.still for cell in row if cell[1] is Ink.SHUT} == {(DOTTED.shut_across, Ink.SHUT)}
    assert drawing.shut == ("imaging door",)
    drawing.tell_time(12 * 3600.0)
    assert not any(ink is Ink.SHUT for row in drawing.still for _, ink in row)


def test_what_was_told_of_before_where_it_drove_and_where_it_was_stuck_stay_in_sight() -> None:
    kept = Recollection([(40.0, 12.5)])
    for view in driving()[:80]:
        kept.take(view)
    inks = {ink for _, ink in _drawing(54, 15, DOTTED).moving(MOVING, kept).values()}
    assert {Ink.TRAIL, Ink.BEFORE, Ink.STUCK, Ink.ROBOT, Ink.SENSED} <= inks
    now = {(round(x, 1), round(y, 1)) for x, y in driving()[79].obstacles}
    assert not now & {(round(x, 1), round(y, 1)) for x, y in kept.before()}


def test_a_screen_that_comes_late_shows_the_way_so_far() -> None:
    way = [(view.pose.x, view.pose.y) for view in driving()[:80] if view.pose is not None]
    kept = Recollection(way=way)
    assert len(kept.trail) == 40
    assert {ink for _, ink in _drawing(54, 15, DOTTED).moving(MOVING, kept).values()} >= {Ink.TRAIL}


@given(st.integers(1, 3000), st.floats(0.05, 3.0))
@settings(max_examples=20, deadline=None)
def test_what_a_screen_remembers_is_bounded(count: int, step: float) -> None:
    kept = Recollection()
    for number in range(count):
        at = number * step
        kept.take(replace(MOVING, stamp=number * 0.25, pose=Pose(at, 0.0, 0.0), obstacles=((at, 1.0), (at, 2.0))))
        kept.take_lines([FeedLine(0.0, "00:00:00", Weight.TROUBLE, "", at=(at, 0.0))])
    assert len(kept.trail) <= 400
    assert len(kept.before()) <= 400
    assert len(list(kept.troubles)) <= 200


def test_a_robot_unsure_of_its_place_has_a_ring_of_two_spreads_around_it() -> None:
    drawing = _drawing(80, 30, DOTTED, _room(10.0, 7.0))
    view = replace(MOVING, pose=Pose(5.0, 3.5, 0.0), route=(), obstacles=(), spread=0.8)
    ring = [spot for spot, (_, ink) in drawing.moving(view).items() if ink is Ink.SPREAD]
    assert ring
    center = drawing.scale.spot((5.0, 3.5))
    assert center is not None
    for row, column in ring:
        meters = math.hypot((row - center[0]) * 4, (column - center[1]) * 2) / drawing.scale.dots_per_meter
        assert abs(meters - 1.6) < 4 / drawing.scale.dots_per_meter + 0.2
    sure = drawing.moving(replace(view, spread=0.03)).values()
    assert not any(ink is Ink.SPREAD for _, ink in sure)


def test_old_news_are_drawn_as_old_by_mark_and_by_look() -> None:
    cells = _drawing(54, 15, DOTTED).moving(MOVING, old=True)
    assert {ink for _, ink in cells.values()} == {Ink.OLD}
    assert DOTTED.old_robot in {char for char, _ in cells.values()}


@given(
    level=st.integers(0, 12),
    x=st.floats(-20.0, 70.0),
    y=st.floats(-20.0, 50.0),
    columns=st.integers(4, 200),
    rows=st.integers(2, 60),
)
@settings(max_examples=40, deadline=None)
def test_any_part_of_the_floor_can_be_looked_at(level: int, x: float, y: float, columns: int, rows: int) -> None:
    scale = scale_of(Sight(level, (x, y)), clinic(), columns, rows)
    assert scale.dots_per_meter >= fit(clinic(), columns, rows).dots_per_meter
    assert scale.dots_per_meter <= max(40.0, fit(clinic(), columns, rows).dots_per_meter)
    at = middle(scale)
    assert -1e-6 <= at[0] <= 45.0 + 1e-6
    assert -1e-6 <= at[1] <= 25.0 + 1e-6
    assert wall_dots(standing(clinic()), scale).shape == (rows * 4, columns * 2)


def test_the_footprint_is_true_to_scale_from_closer() -> None:
    drawing = FloorDrawing(clinic(), cart(), DOTTED)
    drawing.resize(60, 20, Sight(9, (20.0, 12.5)))
    cells = drawing.moving(replace(MOVING, pose=Pose(20.0, 12.5, 0.0), route=(), obstacles=()))
    rows, columns = zip(*(spot for spot, (_, ink) in cells.items() if ink is Ink.ROBOT), strict=True)
    dots = drawing.scale.dots_per_meter
    assert abs((max(columns) - min(columns) + 1) * 2 - 0.6 * dots) <= 4
    assert abs((max(rows) - min(rows) + 1) * 4 - 0.44 * dots) <= 8
