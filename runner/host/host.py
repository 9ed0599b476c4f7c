"""The process that owns a run: it joins the engine, a backend, a clock and the journal, and holds no rules itself.

The order is what matters here:
1. reports of the backend become inputs of the engine, in the order of their stamps;
2. what the engine made of an input is committed to the journal;
3. only then are its commands carried out. An abort is the exception: the robot is halted first, recorded second.

A person's wish is looked at between any two reports. With a virtual clock the host sets the pace by waiting, and what
it waits for is a wish, so that even a slow pace answers at once.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

from backends.contract import (
    ActionReport,
    Backend,
    Goal,
    GoalReport,
    GoalStatus,
    Report,
    Telemetry,
)
from runner.engine.advance import advance
from runner.engine.state import EngineState, initial_state
from runner.engine.values import (
    ActionNews,
    Begin,
    Clear,
    EaseBack,
    Effect,
    Go,
    GoalNews,
    Halt,
    Input,
    Operator,
    Relocate,
    Replan,
    Seen,
    StartCharging,
    Tick,
)
from runner.engine.watching import next_deadline
from runner.host.board import Board
from runner.host.pacing import Pacer
from runner.host.viewing import clock_text, view_of
from runner.host.wording import feed_line
from runner.journal.codec import as_recorded
from runner.journal.writer import JournalWriter
from runner.machine.table import Ending, Event, Machine

SLICE_S = 0.1
"""Wall seconds between two looks at a person's wishes."""
SLICE_UNPACED_S = 1.0
"""Virtual seconds computed at a stretch where no pace is set."""

GOAL_EVENTS: dict[GoalStatus, Event] = {
    GoalStatus.ARRIVED: Event.ARRIVED,
    GoalStatus.REFUSED: Event.REFUSED,
    GoalStatus.NO_ROUTE: Event.NO_ROUTE,
    GoalStatus.HALTED: Event.HALTED,
    GoalStatus.FAILED: Event.FAILED,
}


@dataclass(slots=True)
class Host:
    """One run, from begin to end. `pace` is virtual seconds per wall second, None for as fast as it goes.

    `after_turn` is called in the host's own thread after each turn.
    """

    machine: Machine
    backend: Backend
    journal: JournalWriter
    board: Board
    pace: float | None = None
    after_turn: Callable[[], None] = lambda: None
    state: EngineState = field(init=False)
    _pacer: Pacer = field(init=False)

    def __post_init__(self) -> None:
        self.state = initial_state(self.machine)
        self._pacer = Pacer(self.pace if self.backend.clock.virtual else None, self.backend.clock.now())

    def run(self) -> Ending:
        """Run the mission to its end. Whatever goes wrong, the robot is told to halt before this returns or raises.

        The backend must be open. JournalError where the record cannot be written any more; what the backend raises
        is passed on.
        """
        clock = self.backend.clock
        try:
            now = clock.wall()
            since_midnight = now.hour * 3600.0 + now.minute * 60.0 + now.second + now.microsecond / 1e6
            self._give(Begin(clock.now(), since_midnight))
            while self.state.ended is None:
                self._turn()
            return self.state.ended
        except BaseException:
            self.backend.halt()
            raise

    def _turn(self) -> None:
        """One look at everything: wishes, reports up to the next deadline, timers."""
        self._wishes()
        clock = self.backend.clock
        deadline = next_deadline(self.machine, self.state)
        until = clock.now() + self._slice()
        if deadline is not None:
            until = min(until, deadline)
        reports = self.backend.reports(until)
        for report in reports:
            self._give(_input(report))
        if deadline is not None and (clock.now() >= deadline or (not reports and until >= deadline)):
            self._give(Tick(max(deadline, clock.now())))
        if clock.virtual:
            self._pacer.hold(self.state.held is not None, clock.now())
        self.board.post_view(view_of(self.machine, self.state, clock.now()))
        self.after_turn()

    def _wishes(self) -> None:
        """Carry out what people ask for; wait for it as long as virtual time is ahead of the pace."""
        clock = self.backend.clock
        while (wish := self.board.next_wish(self._pacer.ahead(clock.now()))) is not None:
            if wish.event is Event.ABORT:
                self.backend.halt()
            self._give(Operator(clock.now(), wish.event, wish.who))

    def _slice(self) -> float:
        """How long the backend may be asked to go on without a look at wishes, in seconds of its clock."""
        pace = self._pacer.pace
        if not self.backend.clock.virtual:
            return SLICE_S
        return SLICE_UNPACED_S if pace is None else SLICE_S * pace

    def _give(self, given: Input) -> None:
        """One input through the engine, into the journal, and out to the robot."""
        self.state, effects = advance(self.machine, self.state, given)
        self._record(given, effects)
        for effect in effects:
            if (command := _COMMANDS.get(type(effect))) is not None:
                command(self.backend, effect)
        self._tell(given.stamp, effects)

    def _record(self, given: Input, effects: Sequence[Effect]) -> None:
        if isinstance(given, Seen):
            self.journal.track(given)
            if effects:
                self.journal.write(given.stamp, effects)
        else:
            self.journal.write(given.stamp, [given, *effects])

    def _tell(self, stamp: float, effects: Sequence[Effect]) -> None:
        clock = clock_text(self.state.clock + stamp)
        for effect in effects:
            if (line := feed_line(effect, stamp, clock)) is not None:
                self.board.post_line(line)


def _input(report: Report) -> Input:
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


_COMMANDS: dict[type[Any], Callable[[Backend, Any], None]] = {
    Go: _go,
    Halt: lambda backend, _: backend.halt(),
    Clear: lambda backend, command: backend.clear(command.action_id, command.radius),
    Replan: lambda backend, command: backend.replan(command.action_id),
    EaseBack: lambda backend, command: backend.ease_back(command.action_id, command.distance),
    Relocate: lambda backend, command: backend.relocate(command.action_id, None),
    StartCharging: lambda backend, _: backend.charge(),
}
