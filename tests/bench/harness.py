"""What a measurement is: a module of this package with `measure()`, which yields rows.

To add one, write `tests/bench/<name>.py` with a function `measure() -> Iterable[Row]`; it is found by its name. Measure
the peer in the same process and the same minute: an absolute time means little on a shared machine, the ratio is the
figure. Nothing here asserts: whether a goal is met is for the reader of the table.
"""

from __future__ import annotations

import importlib
import pkgutil
import time
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import cast

HARNESS = ("harness", "__main__")


@dataclass(frozen=True, slots=True)
class Row:
    """One figure. `ratio` is ours against the peer's, the way `goal` is stated; the last four may be unknown."""

    name: str
    value: float
    unit: str
    peer: str = ""
    peer_value: float | None = None
    ratio: float | None = None
    goal: str = ""


Measure = Callable[[], Iterable[Row]]


def names() -> list[str]:
    """The measurements there are."""
    package = importlib.import_module("tests.bench")
    return sorted(found.name for found in pkgutil.iter_modules(package.__path__) if found.name not in HARNESS)


def load(name: str) -> Measure:
    """The function that measures; the module is imported only now."""
    return cast(Measure, importlib.import_module(f"tests.bench.{name}").measure)


def best_time(action: Callable[[], object], repeats: int = 5) -> float:
    """The shortest of some wall times of an action, seconds: the one least disturbed by the rest of the machine."""
    return min(_time(action) for _ in range(repeats))


def _time(action: Callable[[], object]) -> float:
    begun = time.perf_counter()
    action()
    return time.perf_counter() - begun
