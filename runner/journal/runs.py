"""Where runs are kept, what they are called, and how one is found by a name a person types.

Every run has a folder of its own (mode 0700) named after its mission and the wall time at which it was started. The
folder's name is the run's id.
"""

from __future__ import annotations

import difflib
import os
import re
import unicodedata
from collections.abc import Mapping
from datetime import datetime
from pathlib import Path

from runner.journal.errors import JournalError
from runner.journal.reader import open_record
from runner.journal.schema import FILE_NAME

LATEST = "latest"
NAME_LENGTH_MOST = 20
"""Of the mission in an id: with date and time it leaves room for more on a line of 80 columns."""


def runs_folder(environment: Mapping[str, str] = os.environ) -> Path:
    """TRUNDLE_RUNS where it is set; else `trundle/runs` in the user's data folder (XDG base directories)."""
    if chosen := environment.get("TRUNDLE_RUNS"):
        return Path(chosen).expanduser().absolute()
    data = Path(environment.get("XDG_DATA_HOME", ""))
    if not data.is_absolute():  # the XDG specification has relative paths ignored
        data = Path.home() / ".local" / "share"
    return data / "trundle" / "runs"


def new_run(runs: Path, mission: str, created: datetime) -> Path:
    """Make the folder of a new run; its name is the run's id, unique however many start in the same second."""
    name = f"{_plain(mission)}-{created:%Y%m%d-%H%M%S}"
    number = 1
    try:
        runs.mkdir(mode=0o700, parents=True, exist_ok=True)
        while True:
            folder = runs / (name if number == 1 else f"{name}-{number}")
            try:
                folder.mkdir(mode=0o700)
            except FileExistsError:
                number += 1
            else:
                return folder
    except OSError as error:
        raise JournalError(
            f"The folder for runs, {runs}, cannot be used: {error.strerror}. Set TRUNDLE_RUNS to another."
        ) from error


def list_runs(runs: Path) -> list[Path]:
    """The folders of all runs, newest first."""
    return sorted(_folders(runs), key=lambda folder: (_created(folder), len(folder.name), folder.name), reverse=True)


def find_run(runs: Path, text: str = LATEST) -> Path:
    """The folder of the run that `text` means: an id, the beginning of just one id, "latest", or a path.

    JournalError with the nearest ids where there is none, or with all that fit where there are several.
    """
    if os.sep in text or text.endswith(".sqlite"):
        return Path(text).expanduser()
    if text == LATEST:
        return _latest(runs)
    ids = sorted(folder.name for folder in _folders(runs))
    fitting = [text] if text in ids else [name for name in ids if name.startswith(text)]
    if len(fitting) == 1:
        return runs / fitting[0]
    raise JournalError(_several(text, fitting) if fitting else _none(text, ids, runs))


def _latest(runs: Path) -> Path:
    newest = list_runs(runs)
    if not newest:
        raise JournalError(f"There are no runs in {runs} yet.")
    return newest[0]


def _several(text: str, fitting: list[str]) -> str:
    shown = "".join(f"\n  {name}" for name in fitting[:8])
    return f'{len(fitting)} runs begin with "{text}". Write more of the name:{shown}'


def _none(text: str, ids: list[str], runs: Path) -> str:
    near = difflib.get_close_matches(text, ids, n=3, cutoff=0.4)
    shown = "".join(f"\n  {name}" for name in near)
    hint = f" The nearest:{shown}" if near else ' "trundle runs" lists those there are.'
    return f'There is no run "{text}" in {runs}.{hint}'


def _folders(runs: Path) -> list[Path]:
    try:
        return [folder for folder in runs.iterdir() if (folder / FILE_NAME).is_file()]
    except FileNotFoundError:
        return []
    except OSError as error:
        raise JournalError(f"The folder for runs, {runs}, cannot be read: {error.strerror}.") from error


def _created(folder: Path) -> float:
    """Seconds since the epoch at which a run was started; those of the file where its record cannot be read.

    Not read off the id: that is local time, which the end of summer time sets back.
    """
    try:
        with open_record(folder) as record:
            return record.header.created.timestamp()
    except JournalError:
        return (folder / FILE_NAME).stat().st_mtime


def _plain(name: str) -> str:
    """A name in lower-case ASCII letters, digits and hyphens, of whole words as far as they fit."""
    letters = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode().lower()
    words = re.sub(r"[^a-z0-9]+", "-", letters).strip("-")
    if len(words) > NAME_LENGTH_MOST:
        words = words[: NAME_LENGTH_MOST + 1].rpartition("-")[0] or words[:NAME_LENGTH_MOST]
    return words or "run"
