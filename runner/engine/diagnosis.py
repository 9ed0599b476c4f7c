"""What the evidence of an incident speaks for, with its reasons. It sees what the robot reported, never the truth.

The evidence is thin on purpose: the sign of the trouble, what was sensed near the robot when it began and when it
ended, and what was tried last. Each diagnosis is one row of a table, first match wins.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from runner.machine.table import Event
from runner.site.values import Point, Pose

NEAR_M = 2.5
"""Obstacles within this distance of the robot can have to do with the trouble: our choice."""
SAME_M = 0.30
"""A sensed point is the same thing when it is sensed again within this distance: wider than pose and range noise."""


@dataclass(frozen=True, slots=True)
class Evidence:
    """`before` and `after`: points the map does not know, as sensed when the trouble began and when it ended."""

    sign: Event
    detail: str
    before: tuple[Point, ...]
    after: tuple[Point, ...]
    recovered: bool
    helper: str

    @property
    def gone(self) -> float:
        """The share of the points sensed at the beginning that are no longer sensed at the end."""
        if not self.before:
            return 0.0
        missing = sum(1 for point in self.before if not any(_near(point, other, SAME_M) for other in self.after))
        return missing / len(self.before)


@dataclass(frozen=True, slots=True)
class _Diagnosis:
    name: str
    fits: Callable[[Evidence], bool]


def _cleared(evidence: Evidence) -> bool:
    """Forgetting helped, and nothing stood there: what blocked the way was in the robot's memory alone."""
    nothing_there = not evidence.before or evidence.gone >= 0.5
    return evidence.recovered and evidence.helper.startswith("clear") and nothing_there


def _moved_off(evidence: Evidence) -> bool:
    return evidence.recovered and evidence.gone >= 0.5


_TABLE = (
    _Diagnosis("robot refused", lambda evidence: evidence.sign is Event.REFUSED),
    _Diagnosis("robot failed", lambda evidence: evidence.sign is Event.FAILED),
    _Diagnosis("robot halted by itself", lambda evidence: evidence.sign is Event.HALTED),
    _Diagnosis("remembered obstacle that was gone", _cleared),
    _Diagnosis("blocked by something that moved off", _moved_off),
    _Diagnosis("route blocked", lambda evidence: bool(evidence.before) or evidence.sign is Event.NO_ROUTE),
    _Diagnosis("swaying between routes", lambda evidence: evidence.sign is Event.SWAYING),
    _Diagnosis("unknown", lambda _: True),
)


def diagnose(evidence: Evidence) -> tuple[str, tuple[str, ...]]:
    """The name of the diagnosis and its reasons, as sentences."""
    name = next(row.name for row in _TABLE if row.fits(evidence))
    return name, _reasons(evidence)


def _reasons(evidence: Evidence) -> tuple[str, ...]:
    reasons = [f"the sign was '{evidence.sign.value}'"]
    if evidence.detail:
        reasons.append(f"the robot said: {evidence.detail}")
    if evidence.before:
        reasons.append(
            f"{len(evidence.before)} points sensed near the robot when it began, "
            f"{evidence.gone:.0%} of them no longer there at the end"
        )
    else:
        reasons.append(f"nothing unknown to the map was sensed within {NEAR_M:g} m")
    return tuple(reasons)


def near(points: tuple[Point, ...], pose: Pose | None) -> tuple[Point, ...]:
    """The points within NEAR_M of the pose."""
    if pose is None:
        return ()
    return tuple(point for point in points if _near(point, (pose.x, pose.y), NEAR_M))


def _near(one: Point, other: Point, distance: float) -> bool:
    return (one[0] - other[0]) ** 2 + (one[1] - other[1]) ** 2 <= distance * distance
