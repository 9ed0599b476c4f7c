"""The wall clock is set, or jumps with the season, while a run is under way: only clock conditions move."""

from __future__ import annotations

from pathlib import Path
from random import Random

import pytest

from runner.engine.state import initial_state
from runner.host.board import Board
from runner.host.distress import Care, Distress, Teller
from runner.host.host import Host
from runner.journal.reader import open_record
from runner.journal.replay import verify
from runner.journal.schema import FILE_NAME
from runner.journal.writer import JournalWriter
from runner.machine.codec import to_json
from runner.machine.compiler import compile_mission
from tests.builders import HOME, go, mission, repeat, wait
from tests.faults.nights import BEGINS, FaultyRobot, header


def end_of(folder: Path, moves: dict[float, float]) -> tuple[list[float], float]:
    """Run laps of a wait of 60 s until ten minutes after the beginning by the clock, which is moved at some stamps.

    Returns the moves that the record tells of, and the stamp of the end.
    """
    began = BEGINS.hour * 3600.0 + BEGINS.minute * 60.0
    machine = compile_mission(mission(repeat(wait(60.0), until_clock=(began + 600.0) % 86_400.0), go(HOME)))
    robot = FaultyRobot(Random(1), folder / FILE_NAME)  # noqa: S311
    left = dict(moves)

    def set_clock() -> None:
        for stamp in [one for one in left if robot.clock.seconds >= one]:
            robot.clock.moved += left.pop(stamp)

    journal = JournalWriter.create(folder, header(folder.name), (), to_json(machine))
    distress = Distress(folder, "a night", Care(patience=0.0), Teller(folder))
    host = Host(
        machine, initial_state(machine), robot, journal, Board("clock"), distress, after_turn=set_clock, rest=0.0
    )
    host.run()
    journal.close()
    with open_record(folder) as record:
        assert verify(record).sound
        told = [entry.value.seconds for entry in record.entries(names=("clock set",))]  # type: ignore[union-attr]
    return told, robot.clock.seconds


@pytest.mark.parametrize("by", [-3600.0, 3600.0, 240.0, -120.0])
def test_a_clock_that_is_set_moves_clock_conditions_and_no_duration(by: float, tmp_path: Path) -> None:
    told, end = end_of(tmp_path / "straight", {})
    told_moved, end_moved = end_of(tmp_path / "moved", {130.0: by})
    assert told == []
    assert told_moved == [pytest.approx(by, abs=0.5)]
    assert end == pytest.approx(600.0, abs=75.0)
    assert end_moved == pytest.approx(max(600.0 - by, 130.0), abs=75.0), "the end, by the clock, comes as much sooner"
