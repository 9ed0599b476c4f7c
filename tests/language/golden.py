"""What a golden diagnostic is: one mistake, where it is found, what is said and what is offered, to the letter."""

from __future__ import annotations

from typing import NamedTuple


class Case(NamedTuple):
    """A mistake with its golden diagnostic; `place` is line, column and width."""

    mistake: str
    text: str
    place: tuple[int, int, int]
    sentence: str
    help: str
