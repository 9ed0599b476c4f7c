"""What a screen is told: one value that says everything about a run at one moment, and the lines of its feed.

The host makes views; screens and the plain output show them. A view holds no mission logic and no live object, so it
can be sent to another process as it is. Lengths in meters, durations in seconds, headings in radians.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

from backends.contract import LineQuality
from runner.site.values import Point, Pose


class Health(Enum):
    """The one word about a run that can be read from two meters away."""

    STARTING = "starting"
    MOVING = "moving"
    WAITING = "waiting"
    RECOVERING = "recovering"
    HELD = "held"
    NEEDS_YOU = "needs you"
    ENDED = "ended"


class Weight(Enum):
    """How much a line of the feed matters: the ordinary, something to notice, trouble."""

    PLAIN = "plain"
    NOTICE = "notice"
    TROUBLE = "trouble"


@dataclass(frozen=True, slots=True)
class FeedLine:
    """One thing that happened, in words. `at` is where, if it was trouble on the way; `who` acted, if a person did."""

    stamp: float
    clock: str
    weight: Weight
    text: str
    at: Point | None = None
    who: str = ""


@dataclass(frozen=True, slots=True)
class View:
    """A run at one moment. `question` is open if it is not None, and `answers` are the words that answer it.

    `clock` is the time of day as HH:MM:SS. `reason` says in words why the health is what it is. `step` indexes the
    machine's steps, None before the first and after the last. `laps` are those of the loops around the step,
    outermost first, and `laps_at_most` their bounds, None where time or a condition bounds them. `to_visit` are the
    places that a visit under way has still to come to, in the order it will take them if that is known. `place` is
    where the leg under way leads, `leg_limit` its time limit if it has one. `tries` and `recoveries` are those of the
    leg under way, with their bounds.
    """

    stamp: float
    clock: str
    health: Health
    reason: str
    step: int | None = None
    laps: tuple[int, ...] = ()
    laps_at_most: tuple[int | None, ...] = ()
    to_visit: tuple[str, ...] = ()
    place: str | None = None
    leg_seconds: float | None = None
    leg_limit: float | None = None
    tries: int = 0
    tries_at_most: int = 0
    recoveries: int = 0
    recoveries_at_most: int = 0
    pose: Pose | None = None
    spread: float | None = None
    speed: float = 0.0
    battery: float | None = None
    remaining: float | None = None
    route: tuple[Point, ...] = ()
    obstacles: tuple[Point, ...] = ()
    legs_arrived: int = 0
    legs_failed: int = 0
    incidents: int = 0
    question: str | None = None
    answers: tuple[str, ...] = ()
    order: str | None = None
    """The standing order that acts, if one does."""
    repeats_until: float | None = None
    """When the outermost loop around the step is over, as far as is known: by its time, or at the pace of its laps so
    far. A stamp."""
    ends_by: float | None = None
    """The stamp at which the mission is ended wherever it stands."""
    line: LineQuality | None = None
    """How good the line to the robot is, where there is one."""
    outcome: str | None = None
    """Set when the run has ended: how, in words."""
