"""Where a run stands at this moment, in one line: asked of its process, or read off its record where that is mute."""

from __future__ import annotations

import time
from dataclasses import dataclass
from pathlib import Path

from runner.host.remote import UnreachableError, look
from runner.host.view import Health, View
from runner.journal.errors import JournalError
from runner.journal.reader import open_record
from runner.journal.replay import machine_of
from runner.machine.wording import say_seconds


@dataclass(frozen=True, slots=True)
class Standing:
    """`age` is how many wall seconds ago the run last gave a sign of life."""

    state: str
    reason: str
    step: str
    step_number: int | None
    steps: int
    age: float
    watchers: int

    @property
    def text(self) -> str:
        """In a line, or two where there is a step."""
        what = f"{self.state}: {self.reason}" if self.reason else self.state
        where = "" if self.step_number is None else f"step {self.step_number} of {self.steps}: {self.step}\n  "
        watched = "nobody watches" if not self.watchers else f"watched by {self.watchers}"
        return f"{what}\n  {where}last sign of life {_ago(self.age)}; {watched}"


def _ago(age: float) -> str:
    return "just now" if age < 1.0 else f"{say_seconds(float(round(age)))} ago"


def standing_of(folder: Path) -> Standing:
    """Where the run in a folder stands, which some process owns."""
    try:
        news = look(folder)
    except UnreachableError:
        newest = max((path.stat().st_mtime for path in folder.iterdir()), default=0.0)
        return Standing("no answer", "its process does not answer", "", None, 0, time.time() - newest, 0)
    view = news.view or View(0.0, "00:00:00", Health.STARTING, "")
    step, steps = _step(folder, view)
    number = None if view.step is None else view.step + 1
    return Standing(view.health.value, view.reason, step, number, steps, news.age, max(news.watchers - 1, 0))


def _step(folder: Path, view: View) -> tuple[str, int]:
    try:
        with open_record(folder) as record:
            steps = machine_of(record).steps
    except JournalError:
        return "", 0
    return ("" if view.step is None else steps[view.step].text), len(steps)
