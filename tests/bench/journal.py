"""Durable journal entries per second, beside bare SQLite commits of the same bytes in the same minute.

Both write to the same disk with a write-ahead log and synchronous FULL, one transaction a write. The bare peer gets
rows that are ready; ours makes them: JSON, chain, order. With telemetry, each write takes some rows of the track along,
and the peer inserts as many rows of the same columns. Rounds of ours and of the peer's take turns, and the figure is
the median of the ratios, because the disk of a shared machine changes its mind from second to second.
"""

from __future__ import annotations

import sqlite3
import statistics
import tempfile
import time
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from pathlib import Path

from runner.engine.values import Seen, StepBegan, Tick
from runner.journal import schema
from runner.journal.codec import encode, pack_points
from runner.journal.reader import open_record
from runner.journal.writer import JournalWriter
from tests.bench.harness import Row
from tests.journal.records import MACHINE, SOURCES, header, seen

WRITES = 100
ROUNDS = 60
GOAL = "0.9"

INSERT_TRACK = f"INSERT INTO track VALUES (NULL{', ?' * 14})"  # noqa: S608

ONE = (Tick(12.5),)
TEN = tuple(StepBegan(step, "go ward east", 20 + step) for step in range(10))


def measure() -> Iterator[Row]:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        yield rate(folder / "one", "1 entry a write", ONE, track=0)
        yield rate(folder / "ten", "10 entries a write", TEN, track=0)
        yield rate(folder / "track", "1 entry and 5 of the track", ONE, track=5)
        yield from reading(folder / "long")


def rate(folder: Path, name: str, values: Sequence[Tick | StepBegan], track: int) -> Row:
    """Entries a second, ours and bare."""
    telemetry = [
        replace(seen(float(row)), route=seen(0.0).route, obstacles=((9.5, 2.25),) * 60) for row in range(track)
    ]
    bare = bare_connection(folder)
    entries = [(*encode(value), "0" * 64) for value in values]
    rows = [track_row(value) for value in telemetry]
    ours_rates, bare_rates = [], []
    with JournalWriter.create(folder / "ours", header(), SOURCES, MACHINE) as writer:
        for _ in range(ROUNDS):
            ours_rates.append(per_second(lambda: our_write(writer, values, telemetry)) * len(values))
            bare_rates.append(per_second(lambda: bare_write(bare, entries, rows)) * len(values))
    bare.close()
    ratio = statistics.median(ours / peer for ours, peer in zip(ours_rates, bare_rates, strict=True))
    peer = statistics.median(bare_rates)
    return Row(f"journal, {name}", statistics.median(ours_rates), "entries/s", "bare SQLite", peer, ratio, GOAL)


def reading(folder: Path, entries: int = 1_000_000) -> Iterator[Row]:
    """Opening a long record up to the first page of its entries, beside SQLite counting its rows."""
    with JournalWriter.create(folder, header(), SOURCES, MACHINE) as writer:
        for _ in range(entries // 10_000):
            writer.write(1.0, TEN * 1000)
    begun = time.perf_counter()
    with open_record(folder) as record:
        status, first = record.status, next(record.entries())
        seconds = time.perf_counter() - begun
    assert (status.value, first.seq) == ("broken off", 1)
    with sqlite3.connect(folder / schema.FILE_NAME) as connection:
        begun = time.perf_counter()
        connection.execute("SELECT count(*) FROM entry").fetchone()
        peer = time.perf_counter() - begun
    name = "journal, open a record of a million entries"
    yield Row(name, seconds * 1e3, "ms", "SQLite counting its rows", peer * 1e3, seconds / peer, "under 500 ms")


def per_second(write: Callable[[], None]) -> float:
    begun = time.perf_counter()
    for _ in range(WRITES):
        write()
    return WRITES / (time.perf_counter() - begun)


def our_write(writer: JournalWriter, values: Sequence[Tick | StepBegan], telemetry: Sequence[Seen]) -> None:
    for value in telemetry:
        writer.track(value)
    writer.write(12.5, values)


def bare_connection(folder: Path) -> sqlite3.Connection:
    """A file with the same two tables and the same settings."""
    folder.mkdir()
    connection = sqlite3.connect(folder / "bare.sqlite", isolation_level=None)
    for table in schema.TABLES:
        connection.execute(table)
    connection.execute("PRAGMA journal_mode = WAL")
    connection.execute("PRAGMA synchronous = FULL")
    return connection


def bare_write(connection: sqlite3.Connection, entries: Sequence[tuple[str, ...]], track: Sequence[object]) -> None:
    connection.execute("BEGIN IMMEDIATE")
    if track:
        connection.executemany(INSERT_TRACK, track)  # type: ignore[arg-type]
    connection.executemany("INSERT INTO entry VALUES (NULL, 12.5, ?, ?, ?, ?)", entries)
    connection.execute("COMMIT")


def track_row(seen: Seen) -> tuple[object, ...]:
    counters = (seen.spread, seen.speed, seen.battery, seen.driven, seen.remaining, seen.route_number)
    return (
        0,
        seen.stamp,
        seen.pose.x,
        seen.pose.y,
        seen.pose.heading,
        *counters,
        pack_points(seen.obstacles),
        None,
        None,
    )
