"""Where the names of places stand on the floor: beside their place, on no other name, over as little wall as can be."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from runner.screen.ink import cut

_SHORTENED = (None, 9, 6, 4)
"""Lengths at which a name is tried, None for the whole."""


@dataclass(frozen=True, slots=True)
class Label:
    """A text and the cell it begins in."""

    text: str
    row: int
    column: int


def place_labels(spots: Mapping[str, tuple[int, int]], walls: NDArray[np.uint8], more: str) -> dict[str, Label]:
    """A label for each name that finds room; the first names choose first. Names take one cell a character here."""
    taken = np.zeros(walls.shape, dtype=np.bool_)
    for row, column in spots.values():
        taken[row, column] = True
    labels: dict[str, Label] = {}
    for name, spot in spots.items():
        label = _best(name if name.isascii() else _narrow(name), spot, walls, taken, more)
        if label is not None:
            labels[name] = label
            taken[label.row, max(label.column - 1, 0) : label.column + len(label.text) + 1] = True
    return labels


def _narrow(name: str) -> str:
    """Characters that take two cells would shift the drawing."""
    from rich.cells import cell_len

    return "".join(char if cell_len(char) == 1 else "?" for char in name)


def _best(
    name: str, spot: tuple[int, int], walls: NDArray[np.uint8], taken: NDArray[np.bool_], more: str
) -> Label | None:
    """The free position over the least wall, of the longest form of the name that has one."""
    for length in _SHORTENED:
        if length is not None and length >= len(name):
            continue
        text = name if length is None else cut(name, length, more)
        free = [label for label in _around(text, spot) if _fits(label, taken)]
        if free:
            return min(free, key=lambda label: int(np.count_nonzero(_under(label, walls))))
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
    inside = 0 <= label.row < rows and label.column >= 0 and label.column + len(label.text) <= columns
    return inside and not bool(np.any(_under(label, taken)))


def _under(label: Label, grid: NDArray[np.uint8] | NDArray[np.bool_]) -> NDArray[np.uint8] | NDArray[np.bool_]:
    return grid[label.row, label.column : label.column + len(label.text)]
