"""The file a run is recorded in: its tables, its marks, and the chain that holds the entries together.

A record is one SQLite file, readable with the stock `sqlite3` tool:

    sqlite3 journal.sqlite "select seq, stamp, name, body from entry"

- `run`: what the run is, key and value. The only table that holds wall time, names of people or machines.
- `source`: every file the mission was read from, as it was read.
- `machine`: the compiled machine, as JSON.
- `plan`: all else that is needed to go on with the run after its process died, as JSON; empty where nobody can.
- `snapshot`: the engine's state after entry `entry` and row `track` of the track, as MessagePack. Only a shortcut: the
  entries and the track give the same state. The first row of the track after a snapshot has its whole route.
- `entry`: inputs (but telemetry), commands and notes, in order. Two runs of the same mission and seed have the same
  bytes here.
- `track`: telemetry. `after_entry` is the last entry before it, which puts both in one order. `route` is kept only
  where it changed: the new points at its head, followed by the last `route_kept` points of the route before it; both
  are null where nothing changed. Points are little-endian float32 pairs, meters.
- `truth`: of a simulated run, where the robot really was and what really was the case, to score by. No entry follows
  from it and no digest covers it; records made before there was such a table lack it.

Each entry's digest is SHA-256, in hexadecimal, of six lines: the digest before it, seq, stamp (shortest decimal that
reads back the same), kind, name, body. The first digest starts from the machine and the sources.
"""

from __future__ import annotations

import hashlib
import sqlite3
from collections.abc import Iterable

from runner.language.mission import Source

FILE_NAME = "journal.sqlite"
APPLICATION_ID = 0x5472646C
"""Marks the file as ours (bytes 68 to 71 of the header); the letters "Trdl"."""
FORMAT = 1
"""Version of the tables, kept as `user_version`. A table that older programs need not know of does not raise it."""

_STRICT = " STRICT" if sqlite3.sqlite_version_info >= (3, 37) else ""

TABLES = (
    f"CREATE TABLE run (key TEXT PRIMARY KEY, value TEXT NOT NULL){_STRICT}",
    f"CREATE TABLE source (path TEXT PRIMARY KEY, text TEXT NOT NULL, sha256 TEXT NOT NULL){_STRICT}",
    f"CREATE TABLE machine (json TEXT NOT NULL){_STRICT}",
    f"CREATE TABLE plan (json TEXT NOT NULL){_STRICT}",
    f"""CREATE TABLE snapshot (
        seq INTEGER PRIMARY KEY,
        entry INTEGER NOT NULL,
        track INTEGER NOT NULL,
        stamp REAL NOT NULL,
        state BLOB NOT NULL
    ){_STRICT}""",
    f"""CREATE TABLE entry (
        seq INTEGER PRIMARY KEY,
        stamp REAL NOT NULL,
        kind TEXT NOT NULL CHECK (kind IN ('input', 'command', 'note')),
        name TEXT NOT NULL,
        body TEXT NOT NULL,
        digest TEXT NOT NULL
    ){_STRICT}""",
    f"""CREATE TABLE track (
        seq INTEGER PRIMARY KEY,
        after_entry INTEGER NOT NULL,
        stamp REAL NOT NULL,
        x REAL NOT NULL,
        y REAL NOT NULL,
        heading REAL NOT NULL,
        spread REAL NOT NULL,
        speed REAL NOT NULL,
        battery REAL NOT NULL,
        driven REAL NOT NULL,
        remaining REAL,
        route_number INTEGER NOT NULL,
        obstacles BLOB NOT NULL,
        route BLOB,
        route_kept INTEGER
    ){_STRICT}""",
)
TABLE_NAMES = ("run", "source", "machine", "plan", "snapshot", "entry", "track")
"""Without these it is no record."""

TRUTH_TABLE = f"""CREATE TABLE IF NOT EXISTS truth (
        seq INTEGER PRIMARY KEY,
        stamp REAL NOT NULL,
        x REAL NOT NULL,
        y REAL NOT NULL,
        heading REAL NOT NULL,
        cause TEXT NOT NULL
    ){_STRICT}"""


def text_digest(text: str) -> str:
    """SHA-256 of a text in UTF-8, in hexadecimal."""
    return hashlib.sha256(text.encode()).hexdigest()


def first_digest(machine_json: str, sources: Iterable[Source]) -> str:
    """What the chain starts from: the machine, then path and text of each source in order of path."""
    lines = [text_digest(machine_json)]
    for source in sorted(sources, key=lambda source: source.path):
        lines += [source.path, text_digest(source.text)]
    return text_digest("\n".join(lines))


def next_digest(before: str, seq: int, stamp: float, kind: str, name: str, body: str) -> str:
    """The digest of an entry that follows the one with digest `before`."""
    return text_digest(f"{before}\n{seq}\n{stamp!r}\n{kind}\n{name}\n{body}")
