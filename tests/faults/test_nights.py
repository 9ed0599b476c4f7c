"""Nights of random faults in virtual time; and planted bugs, to see that such a night would find them."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import pytest

from backends.contract import Goal
from runner.engine.values import Remark
from runner.host import host, translation
from runner.host.gate import Gate
from runner.journal.writer import JournalWriter
from tests.faults.nights import MEMORY, main, night

FIRST = int(os.environ.get("TRUNDLE_FAULTS_SEED", "1"))


@pytest.fixture
def folder(tmp_path: Path) -> Iterator[Path]:
    """A folder in memory, where there is one: a night commits thousands of times."""
    import tempfile

    with tempfile.TemporaryDirectory(dir=MEMORY or tmp_path) as name:
        yield Path(name)


def test_fifty_nights() -> None:
    main(FIRST, 50)


def test_a_flood_does_not_keep_a_release_waiting_while_the_record_cannot_be_written(folder: Path) -> None:
    """Night 81 found that it did: each remark of the flood cost a turn of its own."""
    night(81, folder / "run")


def test_an_abort_on_a_cut_line_and_a_full_disk_still_reaches_the_robot_when_both_are_mended(folder: Path) -> None:
    """Night 516 found that it did not: the abort could be recorded at last, and nobody halted the robot again."""
    night(516, folder / "run")


@pytest.mark.soak
def test_two_thousand_nights() -> None:
    main(FIRST, 2000)


def caught(folder: Path, wanted: str = "") -> bool:
    """Whether some night says so about the program as it is now."""
    for seed in range(FIRST, FIRST + 20):
        try:
            night(seed, folder / str(seed))
        except AssertionError as error:
            if wanted in str(error):
                return True
    return False


def test_a_host_that_records_an_abort_before_it_halts_is_caught(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(Gate, "abort", lambda *_: None)
    monkeypatch.setattr(Gate, "_halt_once", lambda *_: None)
    monkeypatch.setattr(Gate, "halt", lambda *_: None)
    monkeypatch.setitem(translation.SENDERS, translation.Halt, lambda *_: None)
    assert caught(folder, "an abort was")


def test_an_entry_that_is_acknowledged_and_lost_is_caught(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write = JournalWriter.write

    def losing(self: JournalWriter, stamp: float, values: object) -> None:
        kept = [value for value in values if not isinstance(value, Remark)]  # type: ignore[attr-defined]
        write(self, stamp, kept if len(kept) == len(values) else [])  # type: ignore[arg-type]

    monkeypatch.setattr(JournalWriter, "write", losing)
    assert caught(folder, "acknowledged and lost")


def test_a_goal_that_is_driven_twice_is_caught(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def twice(backend: object, command: object) -> None:
        for _ in range(2):
            backend.go(Goal(command.goal_id, command.pose, command.speed))  # type: ignore[attr-defined]

    monkeypatch.setitem(translation.SENDERS, translation.Go, twice)
    assert caught(folder, "was sent after")


def test_a_command_that_is_sent_before_it_is_recorded_is_caught(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    record = host.Host._record

    def hasty(self: host.Host, made: host._Made) -> None:
        self._send(effect for effect in made.effects if isinstance(effect, translation.Go))
        record(self, made)

    monkeypatch.setattr(host.Host, "_record", hasty)
    assert caught(folder, "before it was recorded")


def test_a_run_that_stands_still_without_being_held_is_caught(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(host.Host, "_slice", lambda *_: 0.0)
    assert caught(folder, "time stands still")


def test_a_trouble_that_does_not_hold_the_mission_is_caught(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    released = host.Host._hold_for

    def careless(self: host.Host, kind: str, detail: str) -> None:
        if kind != "record":
            released(self, kind, detail)
        else:
            self.journal._seq += 1  # and it takes no care of the numbers either

    monkeypatch.setattr(host.Host, "_hold_for", careless)
    assert caught(folder)
