"""All that is needed to own a run, as one value that can be written down: into the record, and to a new process.

The record keeps it so that a run can be picked up from the record alone, whatever has become of the mission's files.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from datetime import timedelta

import msgspec

from backends.contract import Setup
from runner.journal.errors import JournalError
from runner.journal.reader import Record
from runner.site.values import Conditions, Pose


@dataclass(frozen=True, slots=True)
class Care:
    """How a run looks after itself. Durations in seconds of wall time.

    `on_trouble` and `on_end` are argument lists, or one web address each; empty for none. `patience` is how long a
    run in trouble is held for a person before it ends: None for as long as it takes. `attended` is how long the run
    may go on without a watcher before it is held: None for ever. `track_hours` bounds the telemetry that is kept.
    """

    on_trouble: tuple[str, ...] = ()
    on_end: tuple[str, ...] = ()
    patience: float | None = 0.0
    attended: float | None = None
    track_hours: float | None = None


@dataclass(frozen=True, slots=True)
class Plan:
    """A run as it was asked for, but for the machine and the sources, which the record holds beside it."""

    mission: str
    setup: Setup
    backend: str = "sim"
    pace: float | None = None
    care: Care = field(default_factory=Care)


def plan_to_json(plan: Plan) -> str:
    """The plan as JSON."""
    return msgspec.json.encode(plan).decode()


def plan_of(record: Record) -> Plan:
    """The plan in a record. JournalError where there is none that this version can read."""
    try:
        return msgspec.json.decode(record.plan_json, type=Plan)
    except msgspec.MsgspecError as error:
        raise JournalError(f"{record.path} does not say how to go on with the run: {error}.") from error


def later(setup: Setup, seconds: float, pose: Pose | None, times: int) -> Setup:
    """The setup of a simulated world that is built anew so long after the run began, with the robot where it was.

    People walk anew, from a seed of their own for each time that the run is picked up; the battery is full.
    """
    return replace(
        setup,
        start=pose or setup.start,
        seed=setup.seed + times,
        begins=setup.begins + timedelta(seconds=seconds),
        conditions=_later(setup.conditions, seconds),
    )


def _later(conditions: Conditions, seconds: float) -> Conditions:
    """The same conditions, told from so much later on; what is over by then is left out."""
    cartons = tuple(
        replace(
            carton,
            from_s=max(carton.from_s - seconds, 0.0),
            until_s=None if carton.until_s is None else carton.until_s - seconds,
        )
        for carton in conditions.cartons
        if carton.until_s is None or carton.until_s > seconds
    )
    doors = tuple(replace(door, at_s=max(door.at_s - seconds, 0.0)) for door in conditions.doors)
    return replace(conditions, cartons=cartons, doors=doors)
