"""What happened, in words a person reads in the feed: one line a note, or none where it would only be noise."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from runner.engine.values import (
    Answered,
    Asked,
    ClockSet,
    Counted,
    Effect,
    Ended,
    IncidentBegan,
    IncidentEnded,
    LegBegan,
    LegEnded,
    Notified,
    OperatorActed,
    OrderBegan,
    OrderEnded,
    RecoveryBegan,
    Remarked,
    Resumed,
    StepBegan,
    TroubleNoted,
    TryFailed,
)
from runner.host.view import FeedLine, Weight
from runner.machine.table import Ending, Event, Outcome
from runner.machine.wording import say_seconds

SIGNS: dict[Event, str] = {
    Event.STALLED: "no progress",
    Event.SWAYING: "much driving, nothing gained",
    Event.REFUSED: "the robot refused the goal",
    Event.NO_ROUTE: "the robot finds no route",
    Event.FAILED: "the robot gave the goal up",
    Event.HALTED: "the robot halted by itself",
}

_ACTED: dict[str, str] = {"hold": "held", "release": "released", "skip": "skipped", "abort": "aborted"}


def feed_line(effect: Effect, stamp: float, clock: str) -> FeedLine | None:
    """The line for a note; None for commands and for notes that another line already tells."""
    words = _WORDS.get(type(effect))
    if words is None:
        return None
    told = words(effect)
    if told is None:
        return None
    where = effect.pose if isinstance(effect, IncidentBegan) else None
    who = effect.who if isinstance(effect, OperatorActed | Answered) else ""
    return FeedLine(stamp, clock, *told, at=None if where is None else (where.x, where.y), who=who)


Told = tuple[Weight, str] | None


def _step(note: StepBegan) -> Told:
    lap = f" (lap {', '.join(str(lap) for lap in note.laps)})" if note.laps else ""
    return Weight.PLAIN, f"step: {note.text}{lap}"


def _leg_ended(note: LegEnded) -> Told:
    took = f"{note.meters:.1f} m in {note.seconds:.0f} s"
    if note.outcome is Outcome.ARRIVED:
        return Weight.PLAIN, f"arrived at {note.place}: {took}"
    weight = Weight.TROUBLE if note.outcome is Outcome.FAILED else Weight.NOTICE
    return weight, f"leg to {note.place} {note.outcome.value}: {note.reason} ({took})"


def _incident_began(note: IncidentBegan) -> Told:
    where = f" at {note.pose.x:.1f}, {note.pose.y:.1f}" if note.pose else ""
    detail = f": {note.detail}" if note.detail else ""
    return Weight.TROUBLE, f"incident {note.incident}{where}: {SIGNS[note.sign]}{detail}"


def _recovery(note: RecoveryBegan) -> Told:
    return Weight.NOTICE, f"recovery {note.attempt}, try {note.tries}: {note.recovery}"


def _incident_ended(note: IncidentEnded) -> Told:
    took = f"after {note.seconds:.0f} s; {note.diagnosis}"
    if note.recovered:
        return Weight.NOTICE, f"incident {note.incident} over, ended by {note.ended_by}, {took}"
    return Weight.TROUBLE, f"incident {note.incident} not resolved, {took}"


def _try_failed(note: TryFailed) -> Told:
    return Weight.NOTICE, f"try {note.tries} failed; next try in {say_seconds(note.rest)}"


def _acted(note: OperatorActed) -> Told:
    if note.accepted:
        return Weight.NOTICE, f"{_ACTED.get(note.action, note.action)} by {note.who}"
    return Weight.NOTICE, f"{note.action} by {note.who}: no effect now"


def _ended(note: Ended) -> Told:
    weight = Weight.PLAIN if note.ending is Ending.COMPLETED else Weight.TROUBLE
    return weight, f"mission ended: {note.reason}"


def _asked(note: Asked) -> Told:
    silence = f"; after {say_seconds(note.seconds)} it counts as {note.if_silent}"
    return Weight.NOTICE, f"question: {note.text} ({' / '.join(note.answers)}){silence}"


def _answered(note: Answered) -> Told:
    return Weight.NOTICE, f"answer: {note.answer}, {f'by {note.who}' if note.who else 'nobody spoke'}"


def _trouble(note: TroubleNoted) -> Told:
    return Weight.TROUBLE, f"trouble, {note.kind}: {note.detail}{'; held' if note.held else ''}"


def _clock_set(note: ClockSet) -> Told:
    return Weight.NOTICE, f"the clock was set by {note.seconds:+.0f} s"


def _resumed(note: Resumed) -> Told:
    after = f", {say_seconds(float(round(note.down)))} after its process had died" if note.down >= 1.0 else ""
    return Weight.NOTICE, f"picked up by {note.who}{after}"


_WORDS: dict[type[Any], Callable[[Any], Told]] = {
    StepBegan: _step,
    LegBegan: lambda _: None,
    LegEnded: _leg_ended,
    IncidentBegan: _incident_began,
    RecoveryBegan: _recovery,
    IncidentEnded: _incident_ended,
    TryFailed: _try_failed,
    OperatorActed: _acted,
    Asked: _asked,
    Answered: _answered,
    Notified: lambda note: (Weight.NOTICE, f"notice: {note.text}"),
    Counted: lambda note: (Weight.PLAIN, f"{note.name}: {note.value}"),
    OrderBegan: lambda note: (Weight.NOTICE, f"standing order: {note.name}"),
    OrderEnded: lambda note: (Weight.PLAIN, f"standing order over: {note.name}"),
    Remarked: lambda note: (Weight.NOTICE, f"{note.who}: {note.text}"),
    TroubleNoted: _trouble,
    ClockSet: _clock_set,
    Resumed: _resumed,
    Ended: _ended,
}
