"""How a run came out, in one word that the command line, the report and scripts agree on."""

from __future__ import annotations

from enum import Enum

from runner.engine.values import Ended, LegEnded
from runner.journal.reader import Record, Status
from runner.machine.table import Ending, Outcome


class RunOutcome(Enum):
    """What became of a run. The last two say that the mission has no end in the record."""

    ALL_ARRIVED = "completed, every leg arrived"
    SOME_MISSED = "completed, not every leg arrived"
    ENDED_EARLY = "ended early"
    ABORTED = "aborted"
    RUNNING = "still running"
    BROKEN_OFF = "broken off"


def outcome_of(record: Record) -> RunOutcome:
    """The outcome of a run, from its record alone."""
    ending: Ending | None = None
    missed = False
    for entry in record.entries(names=("leg ended", "ended")):
        match entry.value:
            case LegEnded(outcome=outcome):
                missed = missed or outcome is not Outcome.ARRIVED
            case Ended(ending=ending):
                pass
    return outcome_from(ending, missed, record.status)


def outcome_from(ending: Ending | None, missed: bool, status: Status) -> RunOutcome:
    """The outcome that an ending makes, given whether any leg missed its place."""
    if ending is None:
        return RunOutcome.RUNNING if status is Status.RUNNING else RunOutcome.BROKEN_OFF
    if ending is Ending.COMPLETED:
        return RunOutcome.SOME_MISSED if missed else RunOutcome.ALL_ARRIVED
    return RunOutcome.ABORTED if ending is Ending.ABORTED else RunOutcome.ENDED_EARLY
