"""A picture of a floor becomes a site that has the same cells, whatever the picture."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from runner.language.reader import read_site
from runner.site.floor import rasterize
from runner.site.picture import (
    FREE,
    UNSEEN,
    WALL,
    Kinds,
    PictureError,
    Placing,
    cells_of_picture,
    kinds_of,
    placed_by,
    rectangles,
    site_text,
    widest_spot,
)

pictures = arrays(
    np.uint8, st.tuples(st.integers(20, 34), st.integers(20, 34)), elements=st.sampled_from((FREE, FREE, UNSEEN, WALL))
)


@given(pictures)
@settings(max_examples=60, deadline=None)
def test_the_site_of_a_picture_has_the_same_cells(picture: Kinds) -> None:
    picture[3, 4] = FREE
    cells = cells_of_picture(picture, Placing(0.05))
    site = read_site(site_text("Drawn floor", cells, "a remark"), "drawn.yaml")
    assert np.array_equal(rasterize(site).solid, picture[::-1] != FREE)


@given(pictures, st.sampled_from((0.02, 0.03, 0.05, 0.07, 0.1, 0.25)), st.floats(0.0, 0.4), st.floats(0.0, 0.4))
@settings(max_examples=60, deadline=None)
def test_no_wall_is_lost_and_no_floor_is_made_up_at_any_scale(
    picture: Kinds, scale: float, left: float, low: float
) -> None:
    placing = Placing(scale, (left, low))
    cells = cells_of_picture(picture, placing)
    rows = picture.shape[0]
    for row, column in np.argwhere(picture == WALL):
        x, y = left + (column + 0.5) * scale, low + (rows - row - 0.5) * scale
        assert cells[int(y / 0.05), int(x / 0.05)] == WALL
    for row, column in np.argwhere(cells == FREE):
        at_row = rows - 1 - int(((row + 0.5) * 0.05 - low) // scale)
        assert picture[at_row, int(((column + 0.5) * 0.05 - left) // scale)] == FREE


@given(arrays(np.bool_, st.tuples(st.integers(1, 30), st.integers(1, 30))))
def test_rectangles_cover_their_cells_once_and_no_others(cells: np.ndarray) -> None:
    covered = np.zeros(cells.shape, dtype=int)
    for left, low, right, high in rectangles(cells):
        covered[low:high, left:right] += 1
    assert np.array_equal(covered, cells.astype(int))


def test_a_room_is_written_with_few_rectangles() -> None:
    room = np.zeros((40, 60), dtype=np.bool_)
    room[0] = room[-1] = room[:, 0] = room[:, -1] = True
    assert len(list(rectangles(room))) == 4


def test_grays_are_told_apart_by_their_ranges_and_the_rest_was_not_seen() -> None:
    gray = np.array([[0, 100, 101, 199, 200, 255]], dtype=np.uint8)
    assert kinds_of(gray, (0, 100), (200, 255)).tolist() == [[WALL, WALL, UNSEEN, UNSEEN, FREE, FREE]]


def test_a_known_point_lies_in_the_middle_of_its_pixel() -> None:
    picture = np.full((40, 40), FREE, dtype=np.uint8)
    picture[10, 30] = WALL
    placing = placed_by(0.05, (2.525, 3.525), 30, 10, 40)
    cells = cells_of_picture(picture, placing)
    assert np.argwhere(cells == WALL).tolist() == [[70, 50]]


def test_free_floor_beyond_the_origin_is_refused_and_told_how_far() -> None:
    picture = np.full((40, 40), FREE, dtype=np.uint8)
    with pytest.raises(PictureError, match=r"below x 0, down to -0\.50 m.*Add at least 0\.50 m to the x"):
        cells_of_picture(picture, Placing(0.05, (-0.5, 0.0)))


def test_a_picture_without_free_floor_is_refused() -> None:
    with pytest.raises(PictureError, match="gray ranges"):
        widest_spot(np.full((20, 20), WALL, dtype=np.uint8))
