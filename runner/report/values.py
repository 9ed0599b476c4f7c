"""What a report holds, as plain values: legs, incidents, interventions, totals. Its JSON form has these very fields.

Stamps are seconds since the run began; durations in seconds, lengths in meters.
"""

from __future__ import annotations

from dataclasses import dataclass

from runner.journal.header import RunHeader
from runner.journal.outcome import RunOutcome
from runner.machine.table import Event, Outcome
from runner.site.values import Pose


@dataclass(frozen=True, slots=True)
class Leg:
    """One leg. `outcome` is None while it is under way; `next` is what came after a leg that did not arrive.

    `began` is seconds since the run began, `seconds` and `meters` are from there. `line` is the step's in the mission.
    """

    number: int
    step: str
    line: int
    laps: tuple[int, ...]
    place: str
    began: float
    outcome: Outcome | None = None
    seconds: float | None = None
    meters: float | None = None
    tries: int = 0
    recoveries: int = 0
    reason: str = ""
    next: str = ""


@dataclass(frozen=True, slots=True)
class Attempt:
    """A recovery that was tried; `rung` counts from 1 within the rule, `tries` is the try of the leg."""

    recovery: str
    began: float
    rung: int
    tries: int


@dataclass(frozen=True, slots=True)
class Incident:
    """One episode of trouble. `recovered` is None while it lasts; `near` is the nearest place and its distance, m."""

    number: int
    leg: int
    destination: str
    began: float
    pose: Pose | None
    near: tuple[str, float] | None
    sign: Event
    detail: str
    attempts: tuple[Attempt, ...] = ()
    recovered: bool | None = None
    ended_by: str = ""
    seconds: float | None = None
    diagnosis: str = ""
    reasons: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Intervention:
    """A person acted. `accepted` is False where it meant nothing at that moment."""

    stamp: float
    who: str
    action: str
    accepted: bool


@dataclass(frozen=True, slots=True)
class Totals:
    """Sums over the run. The four times add up to `seconds`; a moment counts as held before it counts as recovering,
    as recovering before it counts as driving, and as waiting when it is none of these. `meters` is the robot's own
    count. The batteries are fractions at the first and the last telemetry, None without any.
    """

    arrived: int
    failed: int
    skipped: int
    aborted: int
    incidents: int
    recovered: int
    interventions: int
    meters: float
    seconds: float
    driving: float
    recovering: float
    held: float
    waiting: float
    battery_first: float | None
    battery_last: float | None


@dataclass(frozen=True, slots=True)
class Score:
    """A diagnosis held against the truth. `really` is what was the case, longest first; `right` None where the
    diagnosis says nothing that could be held against it."""

    incident: int
    diagnosis: str
    really: tuple[str, ...]
    right: bool | None


@dataclass(frozen=True, slots=True)
class Whereabouts:
    """How far the robot was from where it believed to be: meters and radians, on average, in 95 of 100 readings, and
    at most."""

    readings: int
    mean: float
    most_of: float
    most: float
    heading_mean: float
    heading_most_of: float


@dataclass(frozen=True, slots=True)
class TruthScore:
    """A simulated run held against the truth."""

    scores: tuple[Score, ...]
    whereabouts: Whereabouts | None


@dataclass(frozen=True, slots=True)
class Summary:
    """A run, summed up. `reason` says what ended it; `truth` is None for a real robot."""

    header: RunHeader
    outcome: RunOutcome
    reason: str
    legs: tuple[Leg, ...]
    incidents: tuple[Incident, ...]
    interventions: tuple[Intervention, ...]
    totals: Totals
    truth: TruthScore | None = None
