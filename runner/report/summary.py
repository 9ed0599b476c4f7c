"""What a run comes to: legs, incidents, interventions and totals, worked out from the entries of its record.

Pure: entries in, values out. How they are shown is `runner.report.text`.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, replace

import msgspec

from runner.engine.values import (
    Ended,
    IncidentBegan,
    IncidentEnded,
    LegBegan,
    LegEnded,
    OperatorActed,
    RecoveryBegan,
    StepBegan,
)
from runner.journal.errors import JournalError
from runner.journal.header import RunHeader
from runner.journal.outcome import outcome_from
from runner.journal.reader import Entry, Reading, Record, Status
from runner.machine.table import Ending, Event, Outcome, Target
from runner.report.truth import truth_score
from runner.report.values import Attempt, Incident, Intervention, Leg, Summary, Totals
from runner.site.values import Pose

HOLD = Event.HOLD.value


def summary_of(record: Record) -> Summary:
    """Sum up a record as far as it goes."""
    status, last = record.status, record.last_stamp()  # first: what ends meanwhile is then still taken in whole
    summary = summarize(
        record.header,
        record.entries(),
        status,
        places=places_of(record.machine_json),
        readings=record.readings(),
        last=last,
        trouble=record.trouble,
    )
    return replace(summary, truth=truth_score(summary.incidents, record.truths(), record.track()))


def summarize(
    header: RunHeader,
    entries: Iterable[Entry],
    status: Status,
    *,
    places: tuple[Target, ...] = (),
    readings: tuple[Reading, Reading] | None = None,
    last: float = 0.0,
    trouble: str = "",
) -> Summary:
    """Sum up the entries of a run.

    `places` are those an incident is placed by, `readings` the robot's first and last counters, `last` the stamp up to
    which a run without an end is counted, `trouble` what ended the record where the mission did not.
    """
    tally = _Tally(places)
    for entry in entries:
        tally.take(entry)
    if tally.ending is None:
        tally.pass_time(max(last, tally.stamp))
    return Summary(
        header,
        outcome_from(tally.ending, tally.missed, status),
        tally.reason or trouble,
        tuple(tally.legs.values()),
        tuple(tally.incidents.values()),
        tuple(tally.interventions),
        tally.totals(readings),
    )


@dataclass(frozen=True, slots=True)
class _Places:
    places: tuple[Target, ...] = ()


def places_of(machine_json: str) -> tuple[Target, ...]:
    """The places a recorded machine drives to."""
    try:
        return msgspec.json.decode(machine_json, type=_Places).places
    except msgspec.MsgspecError as error:
        raise JournalError(f"The machine in the record cannot be read: {error}.") from error


class _Tally:
    """Goes through the entries once, in order, and keeps what a summary needs."""

    def __init__(self, places: tuple[Target, ...]) -> None:
        self._places = places
        self.legs: dict[int, Leg] = {}
        self.incidents: dict[int, Incident] = {}
        self.interventions: list[Intervention] = []
        self._step = StepBegan(0, "", 0)
        self._times = {"driving": 0.0, "recovering": 0.0, "held": 0.0, "waiting": 0.0}
        self._held = False
        self._leg_open = False
        self._incident_open = False
        self._missing: int | None = None  # the leg that did not arrive, until it is known what came next
        self.stamp = 0.0
        self.ending: Ending | None = None
        self.reason = ""

    @property
    def missed(self) -> bool:
        """True where any leg that ended did not arrive."""
        return any(leg.outcome not in (None, Outcome.ARRIVED) for leg in self.legs.values())

    def take(self, entry: Entry) -> None:
        if entry.kind != "note" or self.ending is not None:
            return
        self.pass_time(entry.stamp)
        match entry.value:
            case StepBegan() as note:
                self._step = note
                self._came_next(f"{note.text} (line {note.line})")
            case LegBegan() as note:
                self._leg_began(note)
            case LegEnded() as note:
                self._leg_ended(note)
            case IncidentBegan() as note:
                self._incident_began(note)
            case RecoveryBegan() as note:
                self._recovery_began(note)
            case IncidentEnded() as note:
                self._incident_ended(note)
            case OperatorActed() as note:
                self._operator_acted(note)
            case Ended() as note:
                self.ending, self.reason = note.ending, note.reason
                self._came_next("the mission ended")

    def totals(self, readings: tuple[Reading, Reading] | None) -> Totals:
        outcomes = [leg.outcome for leg in self.legs.values()]
        driven = sum(leg.meters or 0.0 for leg in self.legs.values())
        return Totals(
            arrived=outcomes.count(Outcome.ARRIVED),
            failed=outcomes.count(Outcome.FAILED),
            skipped=outcomes.count(Outcome.SKIPPED),
            aborted=outcomes.count(Outcome.ABORTED),
            incidents=len(self.incidents),
            recovered=sum(incident.recovered is True for incident in self.incidents.values()),
            interventions=sum(intervention.accepted for intervention in self.interventions),
            meters=readings[1].driven - readings[0].driven if readings else driven,
            seconds=self.stamp,
            **self._times,
            battery_first=readings[0].battery if readings else None,
            battery_last=readings[1].battery if readings else None,
        )

    def pass_time(self, stamp: float) -> None:
        self._times[self._activity()] += stamp - self.stamp
        self.stamp = stamp

    def _activity(self) -> str:
        if self._held:
            return "held"
        if self._incident_open:
            return "recovering"
        return "driving" if self._leg_open else "waiting"

    def _came_next(self, what: str) -> None:
        if self._missing is not None:
            self.legs[self._missing] = replace(self.legs[self._missing], next=what)
            self._missing = None

    def _leg_began(self, note: LegBegan) -> None:
        self._leg_open = True
        step = self._step
        self.legs[note.leg] = Leg(note.leg, step.text, step.line, step.laps, note.place, self.stamp)

    def _leg_ended(self, note: LegEnded) -> None:
        self._leg_open = False
        self.legs[note.leg] = replace(
            self.legs[note.leg],
            outcome=note.outcome,
            seconds=note.seconds,
            meters=note.meters,
            tries=note.tries,
            recoveries=note.recoveries,
            reason=note.reason,
        )
        self._missing = None if note.outcome is Outcome.ARRIVED else note.leg

    def _incident_began(self, note: IncidentBegan) -> None:
        self._incident_open = True
        leg = self.legs.get(note.leg)
        self.incidents[note.incident] = Incident(
            number=note.incident,
            leg=note.leg,
            destination=leg.place if leg else "",
            began=self.stamp,
            pose=note.pose,
            near=_nearest(note.pose, self._places),
            sign=note.sign,
            detail=note.detail,
        )

    def _recovery_began(self, note: RecoveryBegan) -> None:
        incident = self.incidents[note.incident]
        attempt = Attempt(note.recovery, self.stamp, note.rung, note.tries)
        self.incidents[note.incident] = replace(incident, attempts=(*incident.attempts, attempt))

    def _incident_ended(self, note: IncidentEnded) -> None:
        self._incident_open = False
        self.incidents[note.incident] = replace(
            self.incidents[note.incident],
            recovered=note.recovered,
            ended_by=note.ended_by,
            seconds=note.seconds,
            diagnosis=note.diagnosis,
            reasons=note.reasons,
        )

    def _operator_acted(self, note: OperatorActed) -> None:
        self.interventions.append(Intervention(self.stamp, note.who, note.action, note.accepted))
        if note.accepted:
            self._held = note.action == HOLD


def _nearest(pose: Pose | None, places: tuple[Target, ...]) -> tuple[str, float] | None:
    """The name of the place nearest to a pose, and how far it is in a straight line."""
    if pose is None or not places:
        return None
    return min(
        ((place.name, math.hypot(place.pose.x - pose.x, place.pose.y - pose.y)) for place in places),
        key=lambda near: (near[1], near[0]),
    )
