"""Where the names of places stand on the floor: beside their place, on no other name, over as little wall as can be."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from rich.cells import cell_len

from runner.screen.ink import Glyphs, cut

_SHORTENED = (9, 6, 4)
"""Lengths to which a name is cut where the whole has no room."""


@dataclass(frozen=True, slots=True)
class Label:
    """A text and the cell it begins in."""

    text: str
    row: int
    column: int


def place_labels(spots: Mapping[str, tuple[int, int]], walls: NDArray[np.uint8], glyphs: Glyphs) -> dict[str, Label]:
    """A label for each name that finds room; the first names choose first. Names take one cell a character here."""
    taken = np.zeros(walls.shape, dtype=np.bool_)
    for row, column in spots.values():
        taken[row, column] = True
    labels: dict[str, Label] = {}
    for name, spot in spots.items():
        taken[spot] = False  # a name may touch its own mark, but no other
        label = _best(_narrow(glyphs.say(name)), spot, walls, taken, glyphs.more)
        taken[spot] = True
        if label is not None:
            labels[name] = label
            taken[label.row, label.column : label.column + len(label.text)] = True
    return labels


def _narrow(name: str) -> str:
    """Characters that do not take one cell each would shift the drawing."""
    return "".join(char if cell_len(char) == 1 else "?" for char in name)


def _best(
    name: str, spot: tuple[int, int], walls: NDArray[np.uint8], taken: NDArray[np.bool_], more: str
) -> Label | None:
    """The free position over the least wall, of the longest form of the name that has one."""
    for text in dict.fromkeys([name, *(cut(name, length, more) for length in _SHORTENED)]):
        free = [label for label in _around(text, spot) if _fits(label, taken)]
        if free:
            return min(free, key=lambda label: _walls_under(label, walls))
    return None


def _around(text: str, spot: tuple[int, int]) -> Iterable[Label]:
    row, column = spot
    yield Label(text, row, column + 1)
    yield Label(text, row, column - len(text))
    for line in (row - 1, row + 1):
        for shift in (len(text) // 2, 0, len(text) - 1):
            yield Label(text, line, column - shift)


def _fits(label: Label, taken: NDArray[np.bool_]) -> bool:
    rows, columns = taken.shape
    first, end = label.column, label.column + len(label.text)
    inside = 0 <= label.row < rows and first >= 0 and end <= columns
    return inside and not bool(taken[label.row, max(first - 1, 0) : end + 1].any())


def _walls_under(label: Label, walls: NDArray[np.uint8]) -> int:
    return int(np.count_nonzero(walls[label.row, label.column : label.column + len(label.text)]))
