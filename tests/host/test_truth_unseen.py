"""What really is the case in a simulated world is journaled, and nothing that decides ever sees it."""

from __future__ import annotations

import ast
from collections.abc import Sequence
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest

import runner
from backends.contract import Cause, Setup, Truth
from backends.sim.simulator import Simulator
from runner.engine.state import initial_state
from runner.host.board import Board
from runner.host.distress import Distress
from runner.host.hooks import Teller
from runner.host.host import Host
from runner.host.plan import Care
from runner.journal.reader import Entry, TruthRow, open_record
from runner.journal.replay import machine_of
from runner.journal.writer import JournalWriter
from runner.machine.codec import to_json
from runner.machine.compiler import compile_mission
from runner.site.values import Carton, Conditions, Pose
from tests.builders import FAR, HOME, go, mission
from tests.journal.records import header

ROOMS = Path(runner.__file__).parent
DECIDING = ("language", "machine", "engine", "screen")
"""Rooms that decide, or show what was decided."""
BLOCKED = Conditions(cartons=(Carton((5.0, 1.5), (0.3, 2.0), when_near=2.0, stays_s=25.0),))


class Liar:
    """The simulator, but what it says of the truth is not so; with `mute` it says nothing of it."""

    def __init__(self, simulator: Simulator) -> None:
        self._simulator = simulator

    def __getattr__(self, name: str) -> Any:
        return getattr(self._simulator, name)

    def truths(self) -> Sequence[Truth]:
        return [
            replace(one, pose=Pose(0.0, 0.0, 0.0), cause=Cause.WHEELS_STUCK, stamp=one.stamp)
            for one in self._simulator.truths()
        ]


class Mute:
    """The simulator as a robot that cannot tell the truth."""

    def __init__(self, simulator: Simulator) -> None:
        self._simulator = simulator

    def __getattr__(self, name: str) -> Any:
        if name == "truths":
            raise AttributeError(name)
        return getattr(self._simulator, name)


def run(folder: Path, wrapped: type[Any] | None) -> tuple[list[Entry], list[TruthRow]]:
    """A round with a carton in the way."""
    written = mission(go(FAR), go(HOME))
    machine = compile_mission(written)
    setup = Setup(written.site, written.robot, written.start.pose, BLOCKED, 3, datetime(2026, 1, 5, 18, 0))
    backend = Simulator(setup) if wrapped is None else wrapped(Simulator(setup))
    backend.open()
    with JournalWriter.create(folder, header(folder.name), (), to_json(machine)) as journal:
        distress = Distress(folder, "a night", Care(patience=0.0), Teller(folder))
        Host(machine, initial_state(machine), backend, journal, Board("x"), distress).run()
    with open_record(folder) as record:
        assert machine_of(record) == machine
        return list(record.entries()), list(record.truths())


@pytest.fixture(scope="module")
def honest(tmp_path_factory: pytest.TempPathFactory) -> tuple[list[Entry], list[TruthRow]]:
    return run(tmp_path_factory.mktemp("runs") / "honest", None)


def test_the_truth_is_in_the_record_about_once_a_second_under_way(
    honest: tuple[list[Entry], list[TruthRow]],
) -> None:
    _, truths = honest
    stamps = [row.stamp for row in truths]
    assert stamps == sorted(stamps)
    assert {row.cause for row in truths} >= {"", "carton in the way"}
    assert 0.5 * stamps[-1] <= len(stamps) <= 2.0 * stamps[-1]


@pytest.mark.parametrize("wrapped", [Liar, Mute])
def test_whatever_the_simulator_says_of_the_truth_the_run_is_the_same_to_the_byte(
    tmp_path: Path, honest: tuple[list[Entry], list[TruthRow]], wrapped: type[Any]
) -> None:
    entries, truths = run(tmp_path / "run", wrapped)
    assert entries == honest[0]
    assert all(row.cause == "wheels stuck" for row in truths) if wrapped is Liar else truths == []


@pytest.mark.parametrize("room", DECIDING)
def test_no_room_that_decides_knows_of_the_truth(room: str) -> None:
    known = {"Truth", "TellsTruth", "TruthRow", "truths", "Cause"}
    for file in sorted((ROOMS / room).rglob("*.py")):
        for node in ast.walk(ast.parse(file.read_text())):
            names = {alias.name for alias in node.names} if isinstance(node, ast.ImportFrom | ast.Import) else set()
            if isinstance(node, ast.Attribute):
                names = {node.attr}
            assert not names & known, f"{file} knows of {sorted(names & known)}"
