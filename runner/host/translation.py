"""Between the words of the engine, of the robot's contract and of a person's wishes. One line each way, no rules."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from backends.contract import ActionReport, Backend, Goal, GoalReport, GoalStatus, Report, Telemetry
from runner.engine.values import (
    ActionNews,
    Answer,
    Answered,
    Clear,
    EaseBack,
    Effect,
    Go,
    GoalNews,
    Halt,
    Input,
    Operator,
    OperatorActed,
    Relocate,
    Remark,
    Remarked,
    Replan,
    Seen,
    StartCharging,
)
from runner.host.board import Wish
from runner.journal.codec import as_recorded
from runner.machine.table import Event

GOAL_EVENTS: dict[GoalStatus, Event] = {
    GoalStatus.ARRIVED: Event.ARRIVED,
    GoalStatus.REFUSED: Event.REFUSED,
    GoalStatus.NO_ROUTE: Event.NO_ROUTE,
    GoalStatus.HALTED: Event.HALTED,
    GoalStatus.FAILED: Event.FAILED,
}


def wished(wish: Wish, stamp: float) -> Input:
    """What a person asks for, in the engine's words."""
    if wish.event is None:
        return Remark(stamp, wish.who, wish.text)
    if wish.event is Event.ANSWERED:
        return Answer(stamp, wish.text, wish.who)
    return Operator(stamp, wish.event, wish.who)


def is_acceptance(effect: Effect) -> bool:
    """Whether a wish was taken, as its effects tell."""
    return isinstance(effect, Answered | Remarked) or (isinstance(effect, OperatorActed) and effect.accepted)


def to_input(report: Report) -> Input:
    """What the robot says, in the engine's words."""
    match report:
        case Telemetry():
            return _seen(report)
        case GoalReport():
            return GoalNews(report.stamp, report.goal_id, GOAL_EVENTS.get(report.status), report.reason)
        case ActionReport():
            return ActionNews(report.stamp, report.action_id, report.done, report.reason)


def _seen(report: Telemetry) -> Seen:
    """Telemetry as the record keeps it, so that the engine is told what a replay will tell it."""
    seen = Seen(
        stamp=report.stamp,
        pose=report.pose,
        spread=report.spread,
        speed=report.speed,
        battery=report.battery,
        driven=report.driven,
        remaining=report.remaining,
        route_number=report.route_number,
        route=report.route,
        obstacles=report.obstacles,
    )
    return as_recorded(seen)


def _go(backend: Backend, command: Go) -> None:
    backend.go(Goal(command.goal_id, command.pose, command.speed, command.relative))


SENDERS: dict[type[Any], Callable[[Backend, Any], None]] = {
    Go: _go,
    Halt: lambda backend, _: backend.halt(),
    Clear: lambda backend, command: backend.clear(command.action_id, command.radius),
    Replan: lambda backend, command: backend.replan(command.action_id),
    EaseBack: lambda backend, command: backend.ease_back(command.action_id, command.distance),
    Relocate: lambda backend, command: backend.relocate(command.action_id, None),
    StartCharging: lambda backend, _: backend.charge(),
}
