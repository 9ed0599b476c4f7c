"""A floor as lines of text: walls, doors, places, and where it is tight; with a list of places and doors."""

from __future__ import annotations

import math
import string
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from runner.site.floor import cell_of, clearance, rasterize
from runner.site.values import CELL_M, Site

TIGHT_M = 0.5
"""Free floor nearer than this to something is drawn as tight."""
TALL = 2.0
"""A character is about twice as high as wide."""
LETTERS = string.ascii_lowercase + string.ascii_uppercase + string.digits


@dataclass(frozen=True, slots=True)
class Marks:
    """The characters of a sketch."""

    solid: str
    door: str
    tight: str
    free: str = " "


ASCII = Marks("#", "+", ".")
DRAWN = Marks("\u2588", "\u2591", "\u00b7")


def sketch(site: Site, columns: int = 80, marks: Marks = ASCII) -> str:
    """The floor, at most so many characters wide, and the list under it."""
    floor = rasterize(site)
    field = clearance(floor.blocked())
    return "\n".join([*_picture(site, field, floor.doors, columns, marks), "", *_list(site, field, marks)])


def _picture(
    site: Site, field: NDArray[np.float32], doors: dict[str, NDArray[np.intp]], across: int, marks: Marks
) -> Iterator[str]:
    wide = max(1, math.ceil(field.shape[1] / across))
    high = max(1, round(wide * TALL))
    is_door = np.zeros(field.shape, dtype=np.bool_)
    for leaf in doors.values():
        is_door[leaf[:, 0], leaf[:, 1]] = True
    letters = {}
    for letter, place in zip(LETTERS, site.places, strict=False):
        row, column = cell_of((place.pose.x, place.pose.y))
        letters[row // high, column // wide] = letter
    spans = [slice(at * wide, (at + 1) * wide) for at in range(math.ceil(field.shape[1] / wide))]
    for block in reversed(range(math.ceil(field.shape[0] / high))):
        rows = slice(block * high, (block + 1) * high)
        yield "".join(
            letters.get((block, at)) or _mark(field[rows, columns], is_door[rows, columns], marks)
            for at, columns in enumerate(spans)
        ).rstrip()


def _mark(field: NDArray[np.float32], door: NDArray[np.bool_], marks: Marks) -> str:
    """What stands for a block of cells: a wall shows however thin it is, but where a door is in it."""
    if door.any():
        return marks.door
    if (field == 0.0).any():
        return marks.solid
    return marks.tight if float(field.min()) < TIGHT_M else marks.free


def _list(site: Site, field: NDArray[np.float32], marks: Marks) -> Iterator[str]:
    yield f"{site.name}, {site.width:g} m x {site.height:g} m."
    yield f"{marks.solid} solid, {marks.door} door, {marks.tight} nearer than {TIGHT_M:g} m to something."
    if site.places:
        yield f"{'':2}{'place':<24} {'x':>7} {'y':>7} {'facing':>8} {'clearance':>10}"
    for number, place in enumerate(site.places):
        letter = LETTERS[number] if number < len(LETTERS) else "-"
        pose = place.pose
        row, column = cell_of((pose.x, pose.y))
        free = max(0.0, float(field[min(row, field.shape[0] - 1), min(column, field.shape[1] - 1)]) - CELL_M / 2.0)
        facing = round(math.degrees(pose.heading)) % 360
        yield f"{letter} {place.name[:24]:<24} {pose.x:>5.2f} m {pose.y:>5.2f} m {facing:>4} deg {free:>8.2f} m"
    if site.doors:
        yield f"{'':2}{'door':<24} {'x':>7} {'y':>7} {'':>8} {'width':>10}"
    for door in site.doors:
        x, y = (door.start[0] + door.end[0]) / 2.0, (door.start[1] + door.end[1]) / 2.0
        width = math.dist(door.start, door.end)
        yield f"{marks.door} {door.name[:24]:<24} {x:>5.2f} m {y:>5.2f} m {'':>8} {width:>8.2f} m"
