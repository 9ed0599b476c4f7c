"""A record is read for what it is, and anything else is refused in a sentence."""

from __future__ import annotations

import shutil
import sqlite3
from pathlib import Path

import pytest

from runner.engine.values import Ended, StepBegan, Tick
from runner.journal.errors import JournalError
from runner.journal.outcome import RunOutcome, outcome_of
from runner.journal.reader import PAGE_ROWS, Reading, Status, chain_break, open_record
from runner.journal.writer import JournalWriter
from runner.machine.table import Ending
from tests.journal.records import (
    MACHINE,
    SOURCES,
    hard_night,
    header,
    leg_that_fails,
    seen,
    smooth_start,
    write_run,
)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    return write_run(tmp_path / header().run_id, hard_night())


def test_a_record_gives_back_what_it_was_made_from(folder: Path) -> None:
    with open_record(folder) as record:
        assert record.header == header()
        assert record.sources == SOURCES
        assert record.machine_json == MACHINE
        assert record.status is Status.ENDED
        assert record.trouble == ""
        assert [entry.value for entry in record.entries()] == [value for _, values in hard_night() for value in values]


def test_a_record_is_opened_by_its_folder_or_by_its_file(folder: Path) -> None:
    with open_record(folder) as one, open_record(folder / "journal.sqlite") as other:
        assert one.header == other.header


def test_entries_can_be_asked_for_from_a_number_on_and_by_name(folder: Path) -> None:
    with open_record(folder) as record:
        whole = list(record.entries())
        assert list(record.entries(after=10)) == whole[10:]
        assert list(record.entries(after=10, names=("leg ended", "ended"))) == [
            entry for entry in whole[10:] if entry.name in ("leg ended", "ended")
        ]


def test_reading_in_pages_leaves_nothing_out(tmp_path: Path) -> None:
    count = 2 * PAGE_ROWS + 1
    with JournalWriter.create(tmp_path / "run", header(), SOURCES, MACHINE) as writer:
        writer.write(0.0, [Tick(0.0)] * count)
        for number in range(count):
            writer.track(seen(float(number)))
    with open_record(tmp_path / "run") as record:
        assert [entry.seq for entry in record.entries()] == list(range(1, count + 1))
        assert [row.seen.stamp for row in record.track()] == [float(number) for number in range(count)]


def test_the_first_and_last_counters_of_the_robot_are_read_without_the_track_between(folder: Path) -> None:
    with open_record(folder) as record:
        assert record.readings() == (Reading(0.0, 0.95, 0.0), Reading(420.0, 0.95 - 0.042, 210.0))
        assert record.last_stamp() == 420.0


def test_the_newest_positions_come_oldest_first(folder: Path) -> None:
    with open_record(folder) as record:
        whole = [(row.seen.pose.x, row.seen.pose.y) for row in record.track()]
        assert record.newest_positions(3) == whole[-3:]
        assert record.newest_positions(10_000) == whole


def test_a_record_without_entries_or_telemetry_can_be_read(tmp_path: Path) -> None:
    JournalWriter.create(tmp_path / "run", header(), SOURCES, MACHINE).close()
    with open_record(tmp_path / "run") as record:
        assert list(record.entries()) == []
        assert list(record.track()) == []
        assert record.readings() is None
        assert record.last_stamp() == 0.0
        assert chain_break(record) is None


def test_a_reader_sees_each_entry_once_it_is_written_and_may_stay_open_meanwhile(tmp_path: Path) -> None:
    writer = JournalWriter.create(tmp_path / "run", header(), SOURCES, MACHINE)
    with writer, open_record(tmp_path / "run") as record:
        for number in range(1, 6):
            writer.write(float(number), [Tick(float(number))])
            assert [entry.seq for entry in record.entries(after=number - 1)] == [number]
        before = record.status
        writer.write(6.0, [Ended(Ending.COMPLETED, "all steps done")])
        assert (before, record.status) == (Status.RUNNING, Status.ENDED)


def test_a_closed_record_can_be_read_where_nothing_may_be_written(folder: Path) -> None:
    folder.chmod(0o500)
    (folder / "journal.sqlite").chmod(0o400)
    with open_record(folder) as record:
        assert chain_break(record) is None
    folder.chmod(0o700)


# --- tampering ------------------------------------------------------------------------------------------------


def first_break(folder: Path, change: str) -> int | None:
    with sqlite3.connect(folder / "journal.sqlite") as connection:
        assert connection.execute(change).rowcount > 0
    connection.close()
    with open_record(folder) as record:
        return chain_break(record)


def test_an_untouched_record_has_a_whole_chain(folder: Path) -> None:
    with open_record(folder) as record:
        assert chain_break(record) is None


@pytest.mark.parametrize(
    ("change", "broken"),
    [
        ("UPDATE entry SET body = replace(body, 'failed', 'arrived') WHERE body LIKE '%all 2 tries used%'", 25),
        ("UPDATE entry SET stamp = stamp + 0.5 WHERE seq = 7", 7),
        ("UPDATE entry SET kind = 'command' WHERE seq = 9", 9),
        ("UPDATE entry SET name = 'tick' WHERE seq = 9", 9),
        ("UPDATE entry SET digest = hex(randomblob(32)) WHERE seq = 12", 12),
        ("DELETE FROM entry WHERE seq = 5", 6),
        ("DELETE FROM entry WHERE seq = 1", 2),
        ("UPDATE entry SET seq = 1000 WHERE seq = 4", 5),
        ("UPDATE source SET text = text || '# a later thought' WHERE path = 'evening.yaml'", 1),
        ("UPDATE machine SET json = '{}'", 1),
    ],
)
def test_a_changed_record_names_the_first_entry_that_does_not_follow(folder: Path, change: str, broken: int) -> None:
    assert first_break(folder, change) == broken


# --- what is refused ------------------------------------------------------------------------------------------


def refusal(path: Path) -> str:
    with pytest.raises(JournalError) as caught:
        open_record(path)
    return str(caught.value)


def test_a_path_with_nothing_there_is_refused(tmp_path: Path) -> None:
    assert "There is no record at" in refusal(tmp_path / "nothing.sqlite")
    assert "There is no record at" in refusal(tmp_path)


@pytest.mark.parametrize("content", [b"", b"mission: Evening round\n", bytes(5000)])
def test_a_file_that_is_no_database_is_refused(tmp_path: Path, content: bytes) -> None:
    (tmp_path / "mission.yaml").write_bytes(content)
    assert "it is not an SQLite database" in refusal(tmp_path / "mission.yaml")


def test_the_database_of_another_program_is_refused(tmp_path: Path) -> None:
    with sqlite3.connect(tmp_path / "other.sqlite") as connection:
        connection.execute("CREATE TABLE run (key, value)")
    assert "it is the database of another program" in refusal(tmp_path / "other.sqlite")


def test_a_record_of_a_newer_version_is_refused_and_says_what_to_do(folder: Path) -> None:
    with sqlite3.connect(folder / "journal.sqlite") as connection:
        connection.execute("PRAGMA user_version = 9")
    message = refusal(folder)
    assert "written by a newer Trundle (format 9; this one reads up to 1)" in message
    assert message.endswith("Update Trundle to read it.")


def test_a_record_cut_off_before_the_run_began_is_refused(folder: Path) -> None:
    with sqlite3.connect(folder / "journal.sqlite") as connection:
        connection.execute("DROP TABLE track")
    assert "was cut off before the run began" in refusal(folder)


def read_all(path: Path) -> None:
    with open_record(path) as record:
        list(record.entries())
        list(record.track())


def test_a_file_that_was_copied_in_part_is_damaged_not_a_crash(folder: Path, tmp_path: Path) -> None:
    whole = (folder / "journal.sqlite").read_bytes()
    for length in (30, 4096, 9000, len(whole) // 2, len(whole) - 4096):
        part = tmp_path / f"{length}.sqlite"
        part.write_bytes(whole[:length])
        with pytest.raises(JournalError, match=r"cannot be read|not the record|holds no run"):
            read_all(part)


def test_a_copy_of_a_broken_off_record_with_its_log_is_read_whole(tmp_path: Path) -> None:
    writer = JournalWriter.create(tmp_path / "run", header(), SOURCES, MACHINE)
    writer.write(0.0, [Tick(0.0)])
    shutil.copytree(tmp_path / "run", tmp_path / "copy")
    writer.close()
    with open_record(tmp_path / "copy") as record:
        assert len(list(record.entries())) == 1
        assert record.status is Status.BROKEN_OFF


# --- how a run came out ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("ending", "outcome_without", "outcome_with_a_failed_leg"),
    [
        (Ending.COMPLETED, RunOutcome.ALL_ARRIVED, RunOutcome.SOME_MISSED),
        (Ending.LEG_FAILED, RunOutcome.ENDED_EARLY, RunOutcome.ENDED_EARLY),
        (Ending.TIMED_OUT, RunOutcome.ENDED_EARLY, RunOutcome.ENDED_EARLY),
        (Ending.ABORTED, RunOutcome.ABORTED, RunOutcome.ABORTED),
        (None, RunOutcome.BROKEN_OFF, RunOutcome.BROKEN_OFF),
    ],
)
def test_the_outcome_follows_from_the_ending_and_the_legs(
    tmp_path: Path, ending: Ending | None, outcome_without: RunOutcome, outcome_with_a_failed_leg: RunOutcome
) -> None:
    end = [(400.0, [Ended(ending, "so it was") if ending else StepBegan(9, "wait", 9)])]
    write_run(tmp_path / "a", [*smooth_start(), *end])
    write_run(tmp_path / "b", [*smooth_start(), *leg_that_fails(), *end])
    with open_record(tmp_path / "a") as without, open_record(tmp_path / "b") as failed:
        assert outcome_of(without) is outcome_without
        assert outcome_of(failed) is outcome_with_a_failed_leg
