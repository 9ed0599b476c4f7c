"""Reads the record of a run: one that ended, one that goes on, one that was broken off.

Nothing here writes. Reading goes in pages of rows, each its own short transaction, because an open one would keep the
writer from emptying its write-ahead log. What cannot be read is a JournalError in a plain sentence.
"""

from __future__ import annotations

import fcntl
import os
import sqlite3
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import datetime
from enum import Enum
from pathlib import Path
from types import TracebackType
from typing import Any, Self
from urllib.parse import quote

from runner.engine.values import Seen
from runner.journal import header as run_header
from runner.journal import schema
from runner.journal.codec import Value, decode, unpack_points
from runner.journal.errors import JournalError, cause
from runner.journal.header import RunHeader
from runner.language.mission import Source
from runner.site.values import Point, Pose

PAGE_ROWS = 1000
ENDED_WITHIN = 1000
"""The mission's end is among so many last entries; after it come only the robot's last answers."""
MAGIC = b"SQLite format 3\x00"


class Status(Enum):
    """Whether a record is whole."""

    RUNNING = "still running"
    ENDED = "ended"
    BROKEN_OFF = "broken off"


@dataclass(frozen=True, slots=True)
class Entry:
    """A row of table `entry`, as it stands there."""

    seq: int
    stamp: float
    kind: str
    name: str
    body: str
    digest: str

    @property
    def value(self) -> Value:
        """The input, command or note itself."""
        return decode(self.kind, self.name, self.body)


@dataclass(frozen=True, slots=True)
class TrackRow:
    """Telemetry that came after entry `after_entry` and before the next."""

    seq: int
    after_entry: int
    seen: Seen


@dataclass(frozen=True, slots=True)
class Snapshot:
    """The engine's state after entry `entry` and row `track` of the track (`runner.engine.codec`)."""

    entry: int
    track: int
    stamp: float
    state: bytes


@dataclass(frozen=True, slots=True)
class Reading:
    """The counters of the robot at one moment: battery as a fraction, path driven in meters."""

    stamp: float
    battery: float
    driven: float


@dataclass(frozen=True, slots=True)
class TruthRow:
    """What really was the case in a simulated world: where the robot was, and what held it up, if anything."""

    stamp: float
    pose: Pose
    cause: str


class Record:
    """An open record. Made by `open_record`; close it, or use it in a `with`."""

    def __init__(self, path: Path, connection: sqlite3.Connection) -> None:
        self.path = path
        self._connection = connection
        rows = dict(self._rows("SELECT key, value FROM run"))
        self.header: RunHeader = run_header.from_rows(rows)
        self.sources: tuple[Source, ...] = tuple(
            Source(*row) for row in self._rows("SELECT path, text FROM source ORDER BY rowid")
        )
        self.machine_json: str = next(iter(self._rows("SELECT json FROM machine")), ("",))[0]
        self.plan_json: str = next(iter(self._rows("SELECT json FROM plan")), ("",))[0]

    @property
    def status(self) -> Status:
        """Ended where the mission has an end in the record; else running while a writer lives."""
        # Looked at first: a writer that ends the run between the two looks must not be taken for one that died.
        running = is_owned(self.path.parent)
        if self._mission_ended():
            return Status.ENDED
        return Status.RUNNING if running and not self._run_value("closed") else Status.BROKEN_OFF

    @property
    def closed(self) -> datetime | None:
        """Wall time at which the record was closed."""
        text = self._run_value("closed")
        return datetime.fromisoformat(text) if text else None

    @property
    def trouble(self) -> str:
        """What ended the record, where it was not the mission; empty otherwise."""
        return self._run_value("trouble")

    def entries(self, after: int = 0, names: Sequence[str] = ()) -> Iterator[Entry]:
        """The entries after number `after`, in order; only those with one of `names`, if any are given.

        Of a record that is being written, those committed by the time they are come to.
        """
        chosen = f" AND name IN ({','.join('?' * len(names))})" if names else ""
        query = f"SELECT seq, stamp, kind, name, body, digest FROM entry WHERE seq > ?{chosen} ORDER BY seq LIMIT ?"  # noqa: S608
        while page := self._rows(query, (after, *names, PAGE_ROWS)):
            for row in page:
                yield Entry(*row)
            after = page[-1][0]

    def newest(self, names: Sequence[str]) -> Entry | None:
        """The last entry with one of these names, if there is any."""
        chosen = ",".join("?" * len(names))
        query = (
            f"SELECT seq, stamp, kind, name, body, digest FROM entry WHERE name IN ({chosen}) ORDER BY seq DESC LIMIT 1"  # noqa: S608
        )
        return next((Entry(*row) for row in self._rows(query, names)), None)

    def track(self, after: int = 0) -> Iterator[TrackRow]:
        """The telemetry, in order, exactly as the engine was told it; after a row that a snapshot names, if any."""
        query = (
            "SELECT seq, after_entry, stamp, x, y, heading, spread, speed, battery, driven, remaining, route_number,"
            " obstacles, route, route_kept FROM track WHERE seq > ? ORDER BY seq LIMIT ?"
        )
        route: tuple[Point, ...] = ()
        while page := self._rows(query, (after, PAGE_ROWS)):
            for row in page:
                route = _route_after(route, *row[13:])
                yield TrackRow(row[0], row[1], _seen(row[2:13], route))
            after = page[-1][0]

    def newest_positions(self, most: int) -> list[Point]:
        """Where the robot believed to be, in the newest rows of the track, oldest first."""
        rows = self._rows("SELECT x, y FROM track ORDER BY seq DESC LIMIT ?", (most,))
        return [(x, y) for x, y in reversed(rows)]

    def truths(self) -> Iterator[TruthRow]:
        """What really was the case, in order; nothing of a real robot, or in a record that is older than this table."""
        if not self._rows("SELECT 1 FROM sqlite_schema WHERE type = 'table' AND name = 'truth'"):
            return
        query, after = "SELECT seq, stamp, x, y, heading, cause FROM truth WHERE seq > ? ORDER BY seq LIMIT ?", 0
        while page := self._rows(query, (after, PAGE_ROWS)):
            for _, stamp, x, y, heading, what in page:
                yield TruthRow(stamp, Pose(x, y, heading), what)
            after = page[-1][0]

    def snapshots(self) -> list[Snapshot]:
        """Those kept, oldest first."""
        return [Snapshot(*row) for row in self._rows("SELECT entry, track, stamp, state FROM snapshot ORDER BY seq")]

    def track_is_whole(self) -> bool:
        """False where the track was bounded and its beginning dropped."""
        first = self._rows("SELECT min(seq) FROM track")[0][0]
        return first is None or first == 1

    def readings(self) -> tuple[Reading, Reading] | None:
        """The first and the last of the robot's counters; None without telemetry."""
        ends = [
            self._rows(f"SELECT stamp, battery, driven FROM track ORDER BY seq {order} LIMIT 1")  # noqa: S608
            for order in ("ASC", "DESC")
        ]
        return (Reading(*ends[0][0]), Reading(*ends[1][0])) if ends[0] else None

    def last_stamp(self) -> float:
        """Seconds since the run began at the newest thing recorded."""
        query = "SELECT max(stamp) FROM (SELECT stamp FROM {0} WHERE seq = (SELECT max(seq) FROM {0}))"
        stamps = [self._rows(query.format(table))[0][0] for table in ("entry", "track")]
        return max((stamp for stamp in stamps if stamp is not None), default=0.0)

    def close(self) -> None:
        self._connection.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def _mission_ended(self) -> bool:
        query = "SELECT 1 FROM entry WHERE name = 'ended' AND seq > (SELECT max(seq) FROM entry) - ? LIMIT 1"
        return bool(self._rows(query, (ENDED_WITHIN,)))

    def _run_value(self, key: str) -> str:
        rows = self._rows("SELECT value FROM run WHERE key = ?", (key,))
        return str(rows[0][0]) if rows else ""

    def _rows(self, query: str, values: Sequence[object] = ()) -> list[tuple[Any, ...]]:
        with _in_words(self.path):
            return self._connection.execute(query, tuple(values)).fetchall()


def open_record(path: Path) -> Record:
    """Open the record in a run's folder, or the file itself, for reading.

    JournalError for a file that is none of ours, or of a newer version than this one reads.
    """
    file = path / schema.FILE_NAME if path.is_dir() else path
    _check_magic(file)
    with _in_words(file):
        connection = sqlite3.connect(f"file:{quote(str(file.absolute()))}?mode=ro", uri=True, isolation_level=None)
    try:
        _check_marks(file, connection)
        return Record(file, connection)
    except BaseException:
        connection.close()
        raise


def chain_break(record: Record) -> int | None:
    """The number of the first entry that does not follow from what stands before it; None where all do.

    The chain starts from the sources and the machine, so a change of those breaks it at the first entry. It cannot
    show that entries are missing at the end.
    """
    digest = schema.first_digest(record.machine_json, record.sources)
    for expected, entry in enumerate(record.entries(), 1):
        digest = schema.next_digest(digest, entry.seq, entry.stamp, entry.kind, entry.name, entry.body)
        if entry.seq != expected or entry.digest != digest:
            return entry.seq
    return None


def _route_after(before: tuple[Point, ...], head: bytes | None, kept: int | None) -> tuple[Point, ...]:
    if head is None or kept is None:
        return before
    return unpack_points(head) + before[len(before) - kept :]


def _seen(row: tuple[Any, ...], route: tuple[Point, ...]) -> Seen:
    stamp, x, y, heading, spread, speed, battery, driven, remaining, route_number, obstacles = row
    pose = Pose(x, y, heading)
    points = unpack_points(obstacles)
    return Seen(stamp, pose, spread, speed, battery, driven, remaining, route_number, route, points)


def _check_magic(file: Path) -> None:
    try:
        with file.open("rb") as opened:
            start = opened.read(len(MAGIC))
    except FileNotFoundError as error:
        raise JournalError(f"There is no record at {file}.") from error
    except OSError as error:
        raise JournalError(f"{file} cannot be opened: {error.strerror}.") from error
    if start != MAGIC:
        raise JournalError(f"{file} is not the record of a run: it is not an SQLite database.")


def _check_marks(file: Path, connection: sqlite3.Connection) -> None:
    with _in_words(file):
        application = connection.execute("PRAGMA application_id").fetchone()[0]
        version = connection.execute("PRAGMA user_version").fetchone()[0]
        tables = {row[0] for row in connection.execute("SELECT name FROM sqlite_schema WHERE type = 'table'")}
    if application != schema.APPLICATION_ID:
        raise JournalError(f"{file} is not the record of a run: it is the database of another program.")
    if version > schema.FORMAT:
        raise JournalError(
            f"{file} was written by a newer Trundle (format {version}; this one reads up to {schema.FORMAT})."
            " Update Trundle to read it."
        )
    if not tables.issuperset(schema.TABLE_NAMES):
        raise JournalError(f"{file} holds no run: it was cut off before the run began.")


def is_owned(folder: Path) -> bool:
    """True while a writer in some process of this computer holds the folder's lock."""
    try:
        handle = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
    except OSError:
        return False
    try:
        fcntl.flock(handle, fcntl.LOCK_SH | fcntl.LOCK_NB)
    except OSError:
        return True
    finally:
        os.close(handle)
    return False


@contextmanager
def _in_words(path: Path) -> Iterator[None]:
    """SQLite's errors as a JournalError."""
    try:
        yield
    except sqlite3.Error as error:
        raise JournalError(f"The record {path} cannot be read: {cause(error)}.") from error
