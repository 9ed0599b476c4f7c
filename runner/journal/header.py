"""What a run is, apart from what happened in it: who started what, when, where and how."""

from __future__ import annotations

import getpass
import os
import platform
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime

import msgspec

from runner.journal.errors import JournalError


@dataclass(frozen=True, slots=True)
class RunHeader:
    """The facts of a run.

    `created` is the wall time at which it was really started, with its zone. `begins` is the site's wall time at stamp
    0, without a zone; a simulated run may begin at any time of day. `pace` is the word given for it: 1, 10, max.
    """

    run_id: str
    mission: str
    site: str
    robot: str
    created: datetime
    begins: datetime
    backend: str
    seed: int
    conditions: str
    pace: str
    version: str
    person: str
    host: str


def person_and_host() -> tuple[str, str]:
    """Who is starting a run, and on which computer."""
    try:
        person = getpass.getuser()
    except (KeyError, OSError):
        person = f"user {os.getuid()}"
    return person, platform.node()


def to_rows(header: RunHeader) -> list[tuple[str, str]]:
    """The header as the rows of table `run`."""
    values = msgspec.to_builtins(header)
    return [(key, str(value)) for key, value in values.items()]


def from_rows(rows: Mapping[str, str]) -> RunHeader:
    """The header kept in table `run`; keys that are no part of it are left alone."""
    try:
        return msgspec.convert(rows, RunHeader, strict=False)
    except msgspec.ValidationError as error:
        raise JournalError(f"The record does not say what run it is of: {error}.") from error
