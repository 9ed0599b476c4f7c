"""The evening round, whole: how many simulated seconds pass in one of a processor core, and where a tick's time goes.

Once as `trundle run` does it, with the record; and once without, timed by part, where `the rest` holds the engine.
"""

from __future__ import annotations

import tempfile
from collections.abc import Iterator
from datetime import datetime, timedelta
from pathlib import Path

import runner
from backends.contract import Setup
from backends.sim.simulator import TICKS_PER_S, Simulator
from runner.host.board import Board
from runner.host.launch import Order, carry_out
from runner.language.examples import CONDITIONS, find_example
from runner.language.reader import load_conditions
from runner.site.values import Conditions
from tests.bench.harness import Row
from tests.bench.night import parts_of, prepare, seconds_of

SEED = 3


def measure() -> Iterator[Row]:
    prepare().open()
    for name in ("quiet", "blocked-corridor", "busy"):
        yield from with_the_record(name)
    yield from by_part()


def with_the_record(name: str) -> Iterator[Row]:
    mission, conditions = read(name)
    order = Order(mission, runner.compile(mission), conditions, None, SEED, None)
    board = Board("bench")
    with tempfile.TemporaryDirectory() as folder:
        spent = seconds_of(lambda: carry_out(order, Path(folder), board, lambda: None))
    view = board.view()
    simulated = view.stamp if view else 0.0
    yield Row(f"evening round, {name}", simulated / spent, "times real time")
    yield Row(f"evening round, {name}: a tick", 1e6 * spent / (simulated * TICKS_PER_S), "us")


def by_part() -> Iterator[Row]:
    mission, conditions = read("busy")
    begins = datetime(2026, 1, 5) + timedelta(seconds=conditions.begins_at)
    simulator = Simulator(Setup(mission.site, mission.robot, mission.start.pose, conditions, SEED, begins))
    machine = runner.compile(mission)
    yield from parts_of("evening round, busy,", simulator, lambda: list(runner.run(machine, simulator)))


def read(name: str) -> tuple[runner.Mission, Conditions]:
    mission = runner.load(found("evening-round", ""))
    return mission, load_conditions(found(name, CONDITIONS), mission.site)


def found(name: str, folder: str) -> Path:
    path = find_example(name, folder)
    assert path is not None, f"{name} comes with Trundle"
    return path
