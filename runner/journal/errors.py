"""What can go wrong with a record, said in a sentence that a person can act on."""

from __future__ import annotations

import sqlite3


class JournalError(Exception):
    """A record cannot be written, found or read. The message is a plain sentence for a person."""


CAUSES = {
    sqlite3.SQLITE_FULL: "the disk is full",
    sqlite3.SQLITE_IOERR: "the disk reports an error or has no room left",
    sqlite3.SQLITE_BUSY: "another program has locked the file",
    sqlite3.SQLITE_LOCKED: "another program has locked the file",
    sqlite3.SQLITE_READONLY: "the file may only be read",
    sqlite3.SQLITE_PERM: "the file's permissions forbid it",
    sqlite3.SQLITE_CANTOPEN: "the file cannot be opened",
    sqlite3.SQLITE_CORRUPT: "the file is damaged",
    sqlite3.SQLITE_NOTADB: "the file is not an SQLite database",
}
"""SQLite's primary result codes (sqlite.org/rescode.html) in words."""


def cause(error: sqlite3.Error) -> str:
    """Why SQLite failed, in words; its own text where there is nothing better."""
    code = getattr(error, "sqlite_errorcode", None)
    if code is None:
        return str(error)
    return CAUSES.get(code & 0xFF, str(error))
