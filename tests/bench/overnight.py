"""A simulated night whole, as `trundle run` drives it: the overnight mission with 20 people about, with its record.

How many simulated seconds pass in one of a processor core, and how that compares with the compiled kernels alone: the
same night again, with a watch around every call from Python into a kernel. The same seed makes it the same night, so
what the watches say is the kernels' share of the time that the first night took.
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import runner
from backends.sim.simulator import TICKS_PER_S
from runner.host.board import Board
from runner.host.launch import Order, carry_out
from runner.language.examples import CONDITIONS, find_example
from runner.language.reader import load_conditions
from tests.bench.harness import Row
from tests.bench.night import prepare, seconds_of

SEED = 3
MISSION, PEOPLE = "overnight-endurance", "twenty-people"
PLACES_OF_KERNELS = ("backends.sim", "runner.site")


@dataclass(slots=True)
class Watch:
    """Time spent in kernels, and how often one was called."""

    seconds: float = 0.0
    calls: int = 0


def measure() -> Iterator[Row]:
    prepare().open()
    simulated, spent = night()
    watch = Watch()
    restore = put_watches(watch)
    try:
        night()
    finally:
        restore()
    kernels = watch.seconds - watch.calls * cost_of_a_watch()
    yield Row(f"{MISSION}, {PEOPLE}", simulated / spent, "times real time", goal="over 500")
    yield Row(
        f"{MISSION}: a tick", 1e6 * spent / (simulated * TICKS_PER_S), "us", "its kernels alone",
        1e6 * kernels / (simulated * TICKS_PER_S), spent / kernels, "under 1.5",
    )  # fmt: skip


def night() -> tuple[float, float]:
    """Simulated seconds, and seconds of processor time that they took."""
    mission = runner.load(found(MISSION, ""))
    conditions = load_conditions(found(PEOPLE, CONDITIONS), mission.site)
    order = Order(mission, runner.compile(mission), conditions, None, SEED, None)
    board = Board("bench")
    with tempfile.TemporaryDirectory() as folder:
        spent = seconds_of(lambda: carry_out(order, Path(folder), board, lambda: None))
    view = board.view()
    assert view is not None, "a night says how far it came"
    return view.stamp, spent


def put_watches(watch: Watch) -> Callable[[], None]:
    """Watch every name by which Python code calls a kernel; returns what takes the watches away again.

    Kernels that call each other are compiled into one another and are not seen. The search is imported where it is
    called, so its own module is where its name is looked up.
    """
    from numba.core.registry import CPUDispatcher

    from runner.site import route_kernels

    changed: list[tuple[Any, str, Any]] = [(route_kernels, "search", route_kernels.search)]
    route_kernels.search = watched(route_kernels.search, watch)
    for name, module in list(sys.modules.items()):
        if not name.startswith(PLACES_OF_KERNELS) or "kernels" in name:
            continue
        for key, value in list(vars(module).items()):
            if isinstance(value, CPUDispatcher):
                changed.append((module, key, value))
                setattr(module, key, watched(value, watch))

    def restore() -> None:
        for module, key, value in changed:
            setattr(module, key, value)

    return restore


def watched(kernel: Callable[..., Any], watch: Watch) -> Callable[..., Any]:
    clock = time.perf_counter

    def call(*arguments: Any) -> Any:
        begun = clock()
        result = kernel(*arguments)
        watch.seconds += clock() - begun
        watch.calls += 1
        return result

    return call


def cost_of_a_watch() -> float:
    """What a watch counts for a call that does nothing, seconds."""
    watch = Watch()
    empty = watched(lambda: None, watch)
    for _ in range(100_000):
        empty()
    return watch.seconds / watch.calls


def found(name: str, folder: str) -> Path:
    path = find_example(name, folder)
    assert path is not None, f"{name} comes with Trundle"
    return path
