"""What was acknowledged stays, whatever happens to the process that writes or to its disk."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from runner.journal.outcome import RunOutcome, outcome_of
from runner.journal.reader import Status, chain_break, open_record

COMMAND = [sys.executable, "-m", "tests.journal.endless"]


@pytest.mark.parametrize("acknowledged_first", [0, 1, 2, 7, 60, 300, 800])
def test_after_a_kill_every_acknowledged_entry_is_there_and_the_chain_is_whole(
    tmp_path: Path, acknowledged_first: int
) -> None:
    folder = tmp_path / "run"
    with subprocess.Popen([*COMMAND, str(folder)], stdout=subprocess.PIPE, text=True) as process:
        assert process.stdout is not None
        lines = [process.stdout.readline() for _ in range(acknowledged_first or 1)]
        process.kill()
        # What follows in the pipe was acknowledged too, after we made up our mind to kill.
        lines += process.stdout.read().splitlines()
    acknowledged = int(next(line for line in reversed(lines) if line.strip()))

    with open_record(folder) as record:
        assert len(list(record.entries())) >= acknowledged
        assert chain_break(record) is None
        assert record.status is Status.BROKEN_OFF
        assert outcome_of(record) is RunOutcome.BROKEN_OFF
        stamps = [row.seen.stamp for row in record.track()]
        assert stamps == [0.25 * count for count in range(1, len(stamps) + 1)]


def test_while_the_writer_lives_the_run_is_running_and_its_entries_are_readable(tmp_path: Path) -> None:
    folder = tmp_path / "run"
    with subprocess.Popen([*COMMAND, str(folder)], stdout=subprocess.PIPE, text=True) as process:
        assert process.stdout is not None
        process.stdout.readline()
        with open_record(folder) as record:
            assert record.status is Status.RUNNING
            assert outcome_of(record) is RunOutcome.RUNNING
            seen_so_far = 0
            for _ in range(5):
                acknowledged = int(process.stdout.readline())
                entries = [entry.seq for entry in record.entries(after=seen_so_far)]
                assert entries == list(range(seen_so_far + 1, seen_so_far + 1 + len(entries)))
                seen_so_far += len(entries)
                assert seen_so_far >= acknowledged
        process.kill()


def test_a_full_disk_is_said_in_words_loses_nothing_and_writing_goes_on_once_there_is_room(tmp_path: Path) -> None:
    folder = tmp_path / "run"
    done = subprocess.run([*COMMAND, str(folder), "300000"], capture_output=True, text=True, check=True, timeout=60)
    *_, before, refused, after = done.stdout.splitlines()
    assert refused.startswith("refused The record ")
    assert refused.endswith("What was recorded before is safe.")
    assert "the disk" in refused
    assert int(after) == int(before) + 1
    with open_record(folder) as record:
        assert len(list(record.entries())) == int(after)
        assert chain_break(record) is None
