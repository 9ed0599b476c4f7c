"""Writes the record of a run while it happens. What `write` returned from is on the disk and stays there.

Rules:
- Exactly one connection, this one, writes and checkpoints; readers open the file for reading only. (SQLite versions up
  to 3.51.2 can damage a write-ahead log that two connections reset at once; sqlite.org/wal.html, "The WAL-Reset Bug".)
- Entries are committed one call a transaction, with a write-ahead log and synchronous FULL: they survive loss of power.
  The track waits for the next entry, or for enough rows or time.
- A snapshot is committed together with all that led to it. The track may be bounded: what is older than the oldest
  snapshot kept is dropped, never an entry.
- A failed write changes nothing here, so the same values may be written again once there is room.
- While a writer lives it holds a lock on the run's folder, which the system drops when its process dies. That is how a
  reader tells a run that goes on from one that was broken off.
- A record that was closed is a single file without companions, so it can be copied as it is.
"""

from __future__ import annotations

import fcntl
import os
import sqlite3
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from datetime import datetime
from pathlib import Path
from types import TracebackType
from typing import Self

from runner.engine.values import Seen
from runner.journal import header as run_header
from runner.journal import schema
from runner.journal.codec import Value, encode, pack_points
from runner.journal.errors import JournalError, cause
from runner.journal.header import RunHeader
from runner.journal.reader import open_record
from runner.language.mission import Source
from runner.site.values import Point, Pose

TRACK_ROWS_AT_MOST = 64
TRACK_SECONDS_AT_MOST = 10.0
"""Telemetry waits for the next entry no longer than this, in rows and in seconds of the run."""

CHECKPOINT_PAGES = 1000
"""Pages of 4 KiB in the write-ahead log before they are moved into the file: a pause of some 20 ms every 4 MB."""

LOG_BYTES_MOST = 16 * 2**20
"""A log that grew beyond this while a reader held it is cut back. Far above an ordinary one: to cut and grow the file
at every checkpoint would cost a tenth of the speed."""

SNAPSHOTS_MOST = 3
"""Kept where the track is not bounded: the last one serves, the others are there in case it cannot be read."""

BUSY_S = 5.0

Row = tuple[object, ...]

_INSERT_ENTRY = "INSERT INTO entry (seq, stamp, kind, name, body, digest) VALUES (?, ?, ?, ?, ?, ?)"
_INSERT_TRACK = (
    "INSERT INTO track (after_entry, stamp, x, y, heading, spread, speed, battery, driven, remaining,"
    " route_number, obstacles, route, route_kept) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)"
)
_INSERT_TRUTH = "INSERT INTO truth (stamp, x, y, heading, cause) VALUES (?, ?, ?, ?, ?)"
_INSERT_SNAPSHOT = (
    "INSERT INTO snapshot (entry, track, stamp, state) VALUES (?, (SELECT coalesce(max(seq), 0) FROM track), ?, ?)"
)


class JournalWriter:
    """The one that writes the record of a run. Made by `create`; used from the thread that made it."""

    def __init__(self, path: Path, connection: sqlite3.Connection, lock: int, digest: str, seq: int = 0) -> None:
        self.path = path
        self._connection = connection
        self._lock = lock
        self._digest = digest
        self._seq = seq
        self._waiting: list[Row] = []
        self._waiting_truths: list[Row] = []
        self._waiting_since = 0.0
        self._route: tuple[Point, ...] | None = ()
        """The route of the newest row; None where the next row must hold its whole route."""
        self._closed = False

    @classmethod
    def create(
        cls, folder: Path, header: RunHeader, sources: Sequence[Source], machine_json: str, plan_json: str = ""
    ) -> Self:
        """Begin the record of a run in its folder, which is made (mode 0700) if it is not there.

        JournalError where the folder holds a record already, is being written by another, or cannot be written.
        """
        path = folder / schema.FILE_NAME
        sources = tuple(dict.fromkeys(sources))
        lock = _lock_folder(folder)
        try:
            if path.exists():
                raise JournalError(f"{folder} holds the record of a run already. Start the run in a folder of its own.")
            connection = _new_file(path, header, sources, machine_json, plan_json)
        except sqlite3.Error as error:
            os.close(lock)
            raise _said(error, path) from error
        except BaseException:
            os.close(lock)
            raise
        return cls(path, connection, lock, schema.first_digest(machine_json, sources))

    @classmethod
    def resume(cls, folder: Path) -> Self:
        """Go on with the record of a run whose writer has died or closed it before the mission ended.

        What is in the record stays; the next entry follows the last. JournalError where another process is writing
        it, or where it is no record of ours.
        """
        lock = _lock_folder(folder)
        path = folder / schema.FILE_NAME
        try:
            with open_record(folder):
                pass  # says in words what is wrong with the file
            connection = _set_up(sqlite3.connect(path, timeout=BUSY_S, isolation_level=None))
            connection.execute("DELETE FROM run WHERE key IN ('closed', 'trouble')")
            connection.execute(schema.TRUTH_TABLE)
            seq, digest = _last_entry(connection)
        except sqlite3.Error as error:
            os.close(lock)
            raise _said(error, path) from error
        except BaseException:
            os.close(lock)
            raise
        writer = cls(path, connection, lock, digest, seq)
        writer._route = None
        return writer

    @property
    def last_entry(self) -> int:
        """The number of the last entry written; 0 before the first."""
        return self._seq

    def write(self, stamp: float, values: Sequence[Value]) -> None:
        """Commit entries, all of the same stamp, and the track that waits. Durable on return.

        JournalError where it cannot be done; then nothing has changed, and nothing recorded before is lost.
        """
        rows, digest = self._entry_rows(float(stamp), values)
        self._commit(rows)
        self._seq += len(rows)
        self._digest = digest

    def track(self, seen: Seen, effects: Sequence[Value] = ()) -> None:
        """Keep telemetry and commit what came of it; where nothing did, it waits for the next entries, or for more.

        JournalError where it cannot be done; then nothing has changed.
        """
        before = self._waiting_since, self._route
        if not self._waiting:
            self._waiting_since = seen.stamp
        self._waiting.append(self._track_row(seen))
        self._route = seen.route
        try:
            if effects:
                self.write(seen.stamp, effects)
            elif len(self._waiting) >= TRACK_ROWS_AT_MOST or seen.stamp - self._waiting_since >= TRACK_SECONDS_AT_MOST:
                self._commit([])
        except BaseException:
            self._waiting.pop()
            self._waiting_since, self._route = before
            raise

    def truth(self, stamp: float, pose: Pose, cause: str) -> None:
        """Keep what really was the case in a simulated world. It waits for the next entries, or for the track."""
        self._waiting_truths.append((stamp, pose.x, pose.y, pose.heading, cause))

    def snapshot(self, stamp: float, state: bytes, track_seconds: float | None = None) -> None:
        """Commit the engine's state as it is after all that was written and tracked so far.

        With `track_seconds`, telemetry that is not needed to follow the record from so long ago on is dropped.
        """
        self._commit([], (stamp, state))
        self._route = None
        with _said_by(self.path), _Transaction(self._connection):
            if track_seconds is None:
                self._connection.execute(
                    "DELETE FROM snapshot WHERE seq <= (SELECT max(seq) FROM snapshot) - ?", (SNAPSHOTS_MOST,)
                )
            else:
                self._drop_before(stamp - track_seconds)

    def _drop_before(self, stamp: float) -> None:
        """Let the newest snapshot that is older than `stamp` be the first thing from which the track goes on."""
        oldest = "SELECT max(seq) FROM snapshot WHERE stamp <= ?"
        self._connection.execute(
            f"DELETE FROM track WHERE seq <= (SELECT track FROM snapshot WHERE seq = ({oldest}))",  # noqa: S608
            (stamp,),
        )
        self._connection.execute(f"DELETE FROM snapshot WHERE seq < ({oldest})", (stamp,))  # noqa: S608
        self._connection.execute("DELETE FROM truth WHERE stamp < (SELECT min(stamp) FROM snapshot)")

    def close(self, trouble: str = "") -> None:
        """End the record. `trouble` says in a sentence what ended it, where it was not the mission.

        Closing twice is closing once.
        """
        if self._closed:
            return
        try:
            self._commit([])
            closing = [("closed", datetime.now().astimezone().isoformat()), ("trouble", trouble)]
            with _Transaction(self._connection):
                self._connection.executemany("INSERT OR REPLACE INTO run VALUES (?, ?)", closing)
            _into_one_file(self._connection)
        except sqlite3.Error as error:
            raise _said(error, self.path) from error
        finally:
            self._closed = True
            self._connection.close()
            os.close(self._lock)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if kind is None:
            self.close()
            return
        try:
            self.close(f"{kind.__name__}: {error}")
        except JournalError:
            return  # the error that ended the run is the one to tell

    def _entry_rows(self, stamp: float, values: Sequence[Value]) -> tuple[list[Row], str]:
        rows: list[Row] = []
        digest = self._digest
        for seq, value in enumerate(values, self._seq + 1):
            kind, name, body = encode(value)
            digest = schema.next_digest(digest, seq, stamp, kind, name, body)
            rows.append((seq, stamp, kind, name, body, digest))
        return rows, digest

    def _track_row(self, seen: Seen) -> Row:
        route, kept = _route_change(self._route, seen.route)
        return (
            self._seq,
            seen.stamp,
            seen.pose.x,
            seen.pose.y,
            seen.pose.heading,
            seen.spread,
            seen.speed,
            seen.battery,
            seen.driven,
            seen.remaining,
            seen.route_number,
            pack_points(seen.obstacles),
            route,
            kept,
        )

    def _commit(self, entries: Sequence[Row], snapshot: tuple[float, bytes] | None = None) -> None:
        alone = not self._waiting and not self._waiting_truths and snapshot is None
        if alone and not entries:
            return
        connection = self._connection
        try:
            if alone and len(entries) == 1:  # a statement is a transaction by itself, and two fewer are a few percent
                connection.execute(_INSERT_ENTRY, entries[0])
                return
            with _Transaction(connection):
                if self._waiting:
                    connection.executemany(_INSERT_TRACK, self._waiting)
                if self._waiting_truths:
                    connection.executemany(_INSERT_TRUTH, self._waiting_truths)
                connection.executemany(_INSERT_ENTRY, entries)
                if snapshot is not None:
                    connection.execute(_INSERT_SNAPSHOT, (self._seq, *snapshot))
        except sqlite3.Error as error:
            raise _said(error, self.path) from error
        self._waiting.clear()
        self._waiting_truths.clear()


def _route_change(before: tuple[Point, ...] | None, route: tuple[Point, ...]) -> tuple[bytes | None, int | None]:
    """The new head of a route and how many points of the end of the route before it still follow.

    (None, None) where nothing changed. A robot that drives along its route cuts points off the head, or moves the
    head with it; any other change is kept whole.
    """
    if before is None:
        return pack_points(route), 0
    if route == before:
        return None, None
    for new in (0, 1):
        kept = len(route) - new
        if 0 < kept <= len(before) and route[new:] == before[len(before) - kept :]:
            return pack_points(route[:new]), kept
    return pack_points(route), 0


def _lock_folder(folder: Path) -> int:
    """Make the folder and hold its lock; the lock goes with the returned file descriptor."""
    try:
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
        lock = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
    except OSError as error:
        raise JournalError(f"The folder {folder} cannot be made or opened: {error.strerror}.") from error
    try:
        fcntl.flock(lock, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError as error:
        os.close(lock)
        raise JournalError(f"Another process is writing the run in {folder}.") from error
    return lock


def _new_file(
    path: Path, header: RunHeader, sources: Sequence[Source], machine_json: str, plan_json: str
) -> sqlite3.Connection:
    connection = sqlite3.connect(path, timeout=BUSY_S, isolation_level=None)
    try:
        # The marks go into the file itself before the write-ahead log exists, so that any tool finds them there.
        connection.execute(f"PRAGMA application_id = {schema.APPLICATION_ID}")
        connection.execute(f"PRAGMA user_version = {schema.FORMAT}")
        with _Transaction(connection):
            for table in (*schema.TABLES, schema.TRUTH_TABLE):
                connection.execute(table)
            connection.executemany("INSERT INTO run VALUES (?, ?)", run_header.to_rows(header))
            digests = [(source.path, source.text, schema.text_digest(source.text)) for source in sources]
            connection.executemany("INSERT INTO source VALUES (?, ?, ?)", digests)
            connection.execute("INSERT INTO machine VALUES (?)", (machine_json,))
            connection.execute("INSERT INTO plan VALUES (?)", (plan_json,))
    except BaseException:
        connection.close()
        raise
    return _set_up(connection)


def _set_up(connection: sqlite3.Connection) -> sqlite3.Connection:
    """Write-ahead log and durability, for a file that is about to be written."""
    try:
        connection.execute("PRAGMA journal_mode = WAL")
        connection.execute("PRAGMA synchronous = FULL")
        connection.execute(f"PRAGMA wal_autocheckpoint = {CHECKPOINT_PAGES}")
        connection.execute(f"PRAGMA journal_size_limit = {LOG_BYTES_MOST}")
    except BaseException:
        connection.close()
        raise
    return connection


def _last_entry(connection: sqlite3.Connection) -> tuple[int, str]:
    """Number and digest of the last entry; where there is none, those from which the chain starts."""
    row = connection.execute("SELECT seq, digest FROM entry ORDER BY seq DESC LIMIT 1").fetchone()
    if row is not None:
        return int(row[0]), str(row[1])
    machine_json = connection.execute("SELECT json FROM machine").fetchone()[0]
    sources = [Source(*row) for row in connection.execute("SELECT path, text FROM source ORDER BY rowid")]
    return 0, schema.first_digest(machine_json, sources)


def _into_one_file(connection: sqlite3.Connection) -> None:
    """Move the write-ahead log into the file. A reader may be in the way; then the log stays beside it, whole."""
    connection.execute("PRAGMA busy_timeout = 500")
    try:
        connection.execute("PRAGMA journal_mode = DELETE")
    except sqlite3.OperationalError:
        connection.execute("PRAGMA wal_checkpoint(PASSIVE)")


class _Transaction:
    """A transaction as a `with`; not a generator, because this is what every entry waits for."""

    __slots__ = ("_connection",)

    def __init__(self, connection: sqlite3.Connection) -> None:
        self._connection = connection

    def __enter__(self) -> None:
        self._connection.execute("BEGIN IMMEDIATE")

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        try:
            if kind is None:
                self._connection.execute("COMMIT")
        finally:
            if self._connection.in_transaction:
                self._connection.execute("ROLLBACK")


@contextmanager
def _said_by(path: Path) -> Iterator[None]:
    try:
        yield
    except sqlite3.Error as error:
        raise _said(error, path) from error


def _said(error: sqlite3.Error, path: Path) -> Exception:
    """SQLite's error as a JournalError; wrong use of it is a fault of ours and stays what it is."""
    if isinstance(error, sqlite3.ProgrammingError):
        return error
    return JournalError(f"The record {path} cannot be written: {cause(error)}. What was recorded before is safe.")
