"""The list of runs: one line each, newest first."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from runner.engine.values import LegEnded
from runner.journal.errors import JournalError
from runner.journal.outcome import RunOutcome, outcome_of
from runner.journal.reader import open_record
from runner.machine.table import Outcome
from runner.report.text import cut

SHORT = {
    RunOutcome.ALL_ARRIVED: "completed",
    RunOutcome.SOME_MISSED: "legs missed",
    RunOutcome.ENDED_EARLY: "ended early",
    RunOutcome.ABORTED: "aborted",
    RunOutcome.RUNNING: "still running",
    RunOutcome.BROKEN_OFF: "broken off",
}
ROW = "{:<38}  {:<16}  {:<13}  {}"


@dataclass(frozen=True, slots=True)
class Listed:
    """A run in the list. Where its record cannot be read, `trouble` says why and the rest is empty."""

    run_id: str
    mission: str = ""
    started: datetime | None = None
    begins: datetime | None = None
    outcome: RunOutcome | None = None
    legs_arrived: int = 0
    legs_ended: int = 0
    trouble: str = ""


def listed(folder: Path) -> Listed:
    """What the list says about the run in a folder."""
    try:
        with open_record(folder) as record:
            header = record.header
            legs = [entry.value for entry in record.entries(names=("leg ended",))]
            arrived = sum(isinstance(leg, LegEnded) and leg.outcome is Outcome.ARRIVED for leg in legs)
            outcome = outcome_of(record)
    except JournalError as error:
        return Listed(folder.name, trouble=str(error))
    return Listed(folder.name, header.mission, header.created, header.begins, outcome, arrived, len(legs))


def listing_text(runs: Sequence[Listed]) -> str:
    """The list as text, 80 columns in plain ASCII. The id says when a run was started."""
    rows = [ROW.format("Run (with date and time of its start)", "Mission", "Outcome", "Legs")]
    for run in runs:
        outcome = SHORT[run.outcome] if run.outcome else "not readable"
        legs = f"{run.legs_arrived}/{run.legs_ended}" if run.outcome else "-"
        rows.append(ROW.format(run.run_id, cut(run.mission, 16), outcome, legs).rstrip())
    return "\n".join(rows) + "\n"
