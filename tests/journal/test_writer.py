"""The writer keeps its promises about the file: marks, order, exactness, one file at the end."""

from __future__ import annotations

import sqlite3
from pathlib import Path
from typing import Any

import pytest

from runner.engine.values import Seen, Tick
from runner.journal.codec import encode
from runner.journal.errors import JournalError
from runner.journal.reader import Status, open_record
from runner.journal.schema import APPLICATION_ID, FORMAT
from runner.journal.writer import TRACK_ROWS_AT_MOST, TRACK_SECONDS_AT_MOST, JournalWriter
from tests.journal.records import MACHINE, SOURCES, hard_night, header, seen, write_run


@pytest.fixture
def writer(tmp_path: Path) -> JournalWriter:
    return JournalWriter.create(tmp_path / "run", header(), SOURCES, MACHINE)


def rows_in(writer: JournalWriter, table: str) -> list[tuple[Any, ...]]:
    """What another program finds in the file at this moment."""
    with sqlite3.connect(f"file:{writer.path}?mode=ro", uri=True) as connection:
        return connection.execute(f"SELECT * FROM {table} ORDER BY seq").fetchall()  # noqa: S608


def test_the_file_carries_its_marks_in_its_header_from_the_first_moment(writer: JournalWriter) -> None:
    start = writer.path.read_bytes()[:100]
    assert int.from_bytes(start[68:72], "big") == APPLICATION_ID
    assert int.from_bytes(start[60:64], "big") == FORMAT


def test_the_folder_of_a_run_is_for_its_owner_alone(writer: JournalWriter) -> None:
    assert writer.path.parent.stat().st_mode & 0o777 == 0o700


def test_an_entry_is_in_the_file_when_write_returns(writer: JournalWriter) -> None:
    writer.write(0.25, [Tick(0.25)])
    assert [row[:5] for row in rows_in(writer, "entry")] == [(1, 0.25, "input", "tick", '{"stamp":0.25}')]


def test_the_track_waits_for_the_next_entry(writer: JournalWriter) -> None:
    writer.track(seen(0.0))
    assert rows_in(writer, "track") == []
    writer.write(0.0, [Tick(0.0)])
    assert len(rows_in(writer, "track")) == 1


def test_the_track_waits_no_longer_than_so_many_rows(writer: JournalWriter) -> None:
    for count in range(TRACK_ROWS_AT_MOST):
        assert rows_in(writer, "track") == []
        writer.track(seen(count * 0.01))
    assert len(rows_in(writer, "track")) == TRACK_ROWS_AT_MOST


def test_the_track_waits_no_longer_than_so_many_seconds_of_the_run(writer: JournalWriter) -> None:
    writer.track(seen(100.0))
    writer.track(seen(100.0 + TRACK_SECONDS_AT_MOST))
    assert len(rows_in(writer, "track")) == 2


ROUTES = [
    ((0.0, 0.0), (1.0, 0.0), (2.0, 0.0), (3.0, 0.5)),  # new
    ((0.0, 0.0), (1.0, 0.0), (2.0, 0.0), (3.0, 0.5)),  # the same
    ((1.0, 0.0), (2.0, 0.0), (3.0, 0.5)),  # its head cut off
    ((1.5, 0.25), (2.0, 0.0), (3.0, 0.5)),  # its head moved along with the robot
    ((1.5, 0.25), (2.0, 0.0), (3.0, 0.75)),  # its end moved
    ((1.5, 0.25), (1.75, 0.25), (2.0, 0.0), (3.0, 0.75)),  # longer by a point
    (),  # none
    (),
    ((5.0, 5.0),),
]


def test_telemetry_comes_back_exactly_whatever_the_route_does(writer: JournalWriter) -> None:
    given = [seen(0.1 * count, route=route, route_number=1 + count // 4) for count, route in enumerate(ROUTES)]
    given.append(seen(2.0, remaining=None, obstacles=(), battery=0.1 + 0.2))
    for telemetry in given:
        writer.track(telemetry)
    writer.close()
    with open_record(writer.path) as record:
        assert [row.seen for row in record.track()] == given


def test_only_what_changed_of_a_route_is_kept(writer: JournalWriter) -> None:
    for count, route in enumerate(ROUTES[:4]):
        writer.track(seen(float(count), route=route))
    writer.write(4.0, [Tick(4.0)])
    assert [(len(row[13]) // 8, row[14]) if row[13] is not None else None for row in rows_in(writer, "track")] == [
        (4, 0),
        None,
        (0, 3),
        (1, 2),
    ]


def test_entries_and_telemetry_can_be_put_back_into_the_order_in_which_they_came(writer: JournalWriter) -> None:
    given: list[Seen | Tick] = [seen(0.0), Tick(0.1), Tick(0.1), seen(0.2), seen(0.3), Tick(0.4), seen(0.5)]
    for value in given:
        if isinstance(value, Seen):
            writer.track(value)
        else:
            writer.write(value.stamp, [value])
    writer.close()
    with open_record(writer.path) as record:
        # Telemetry that came after entry n stands before entry n + 1.
        ordered = [((entry.seq, 0, 0), entry.value) for entry in record.entries()]
        ordered += [((row.after_entry, 1, row.seq), row.seen) for row in record.track()]
    assert [value for _, value in sorted(ordered, key=lambda one: one[0])] == given


def test_two_runs_of_the_same_values_have_the_same_entries_to_the_byte(tmp_path: Path) -> None:
    tables = []
    for name, person, every in (("monday", "mara", 1.0), ("tuesday", "jonas", 0.5)):
        folder = write_run(tmp_path / name, hard_night(), person=person, every=every)
        with sqlite3.connect(folder / "journal.sqlite") as connection:
            tables.append(connection.execute("SELECT * FROM entry ORDER BY seq").fetchall())
    assert tables[0] == tables[1]
    assert len(tables[0]) > 30


def test_another_machine_or_another_source_gives_other_digests(tmp_path: Path) -> None:
    digests = set()
    for name, sources, machine in (("a", SOURCES, MACHINE), ("b", SOURCES[:1], MACHINE), ("c", SOURCES, "{}")):
        with JournalWriter.create(tmp_path / name, header(), sources, machine) as writer:
            writer.write(0.0, [Tick(0.0)])
            digests.add(rows_in(writer, "entry")[0][5])
    assert len(digests) == 3


def test_a_second_record_in_the_same_folder_is_refused(writer: JournalWriter) -> None:
    with pytest.raises(JournalError, match="Another process is writing the run"):
        JournalWriter.create(writer.path.parent, header(), SOURCES, MACHINE)
    writer.close()
    with pytest.raises(JournalError, match="holds the record of a run already"):
        JournalWriter.create(writer.path.parent, header(), SOURCES, MACHINE)


def test_a_folder_that_cannot_be_made_is_a_sentence(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    with pytest.raises(JournalError, match="cannot be made or opened: Not a directory"):
        JournalWriter.create(tmp_path / "file" / "run", header(), SOURCES, MACHINE)


def test_a_locked_file_is_a_sentence_and_the_values_can_be_written_afterwards(writer: JournalWriter) -> None:
    writer.write(0.0, [Tick(0.0)])
    writer._connection.execute("PRAGMA busy_timeout = 20")
    other = sqlite3.connect(writer.path, isolation_level=None)
    other.execute("BEGIN IMMEDIATE")
    writer.track(seen(1.0))
    with pytest.raises(JournalError, match="another program has locked the file"):
        writer.write(1.0, [Tick(1.0)])
    assert writer.last_entry == 1
    other.execute("ROLLBACK")
    other.close()
    writer.write(1.0, [Tick(1.0)])
    assert [row[0] for row in rows_in(writer, "entry")] == [1, 2]
    assert len(rows_in(writer, "track")) == 1


def test_a_value_that_cannot_be_recorded_leaves_the_record_as_it_was(writer: JournalWriter) -> None:
    with pytest.raises(ValueError, match="cannot be recorded"):
        writer.write(0.0, [Tick(0.0), Tick(float("nan"))])
    assert writer.last_entry == 0
    assert rows_in(writer, "entry") == []


def test_a_closed_record_is_one_file_with_everything_in_it(writer: JournalWriter) -> None:
    writer.write(0.0, [Tick(0.0)])
    writer.track(seen(0.5))
    writer.close()
    writer.close()
    assert [path.name for path in writer.path.parent.iterdir()] == ["journal.sqlite"]
    assert len(rows_in(writer, "track")) == 1


def test_a_reader_in_the_middle_of_reading_does_not_keep_the_record_from_closing(writer: JournalWriter) -> None:
    writer.write(0.0, [Tick(0.0), Tick(0.0)])
    with open_record(writer.path) as record:
        entries = record.entries()
        next(entries)
        writer.close()
        assert next(entries).seq == 2
    with open_record(writer.path) as record:
        assert len(list(record.entries())) == 2


def test_an_error_in_the_run_is_kept_in_its_record(tmp_path: Path) -> None:
    writer = JournalWriter.create(tmp_path / "run", header(), SOURCES, MACHINE)
    with pytest.raises(RuntimeError), writer:
        raise RuntimeError("the robot's driver went away")
    with open_record(writer.path) as record:
        assert record.trouble == "RuntimeError: the robot's driver went away"
        assert record.status is Status.BROKEN_OFF
        assert record.closed is not None


def test_what_is_written_is_what_the_codec_makes(writer: JournalWriter) -> None:
    values = [value for _, values in hard_night() for value in values]
    writer.write(0.0, values)
    assert [row[2:5] for row in rows_in(writer, "entry")] == [encode(value) for value in values]
