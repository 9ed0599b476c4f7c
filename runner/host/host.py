"""The process that owns a run: it joins the engine, a backend, a clock and the journal, and holds no rules itself.

The order is what matters here:
1. reports of the backend become inputs of the engine, in the order of their stamps;
2. what the engine made of an input is committed to the journal, and only then is it the state of the run;
3. only then are its commands carried out. An abort is the exception: the robot is halted first, recorded second.

A person's wish is looked at between any two reports. With a virtual clock the host sets the pace by waiting, and what
it waits for is a wish, so that even a slow pace answers at once.

Trouble outside the mission (the record cannot be written, the robot fails or is silent, a fault of ours) halts the
robot first. Then the mission is held, as a person would hold it, until a person releases or aborts it, or until the
patience that the run was given is at its end.
"""

from __future__ import annotations

import contextlib
import time
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

from backends.contract import Backend
from runner.engine.advance import advance
from runner.engine.codec import state_to_bytes
from runner.engine.state import EngineState
from runner.engine.values import (
    ActionNews,
    Begin,
    ClockMoved,
    Command,
    Effect,
    Input,
    PickedUp,
    Seen,
    Tick,
    Trouble,
)
from runner.engine.watching import next_deadline
from runner.host.board import Board, Wish
from runner.host.clocks import WallWatch, seconds_of_day
from runner.host.distress import Distress, RunError
from runner.host.gate import Gate, RobotError
from runner.host.pacing import HELD_PACE, Pacer
from runner.host.translation import SENDERS, is_acceptance, to_input, wished
from runner.host.view import Health
from runner.host.viewing import clock_text, view_of
from runner.host.wording import feed_line
from runner.journal.errors import JournalError
from runner.journal.writer import JournalWriter
from runner.machine.table import Ending, Event, Machine
from runner.site.values import DAY_S

SLICE_S = 0.1
"""Wall seconds between two looks at a person's wishes, at a pace."""
SLICE_REAL_S = 0.005
"""The same on a real robot: a goal decided must not wait. An abort does not wait even for this (`runner.host.gate`)."""
SLICE_UNPACED_S = 1.0
"""Virtual seconds computed at a stretch where no pace is set."""
VIEW_S = 0.1
"""Between two views of a real robot, at least, where nothing happened."""
VIEW_REAL_S = 0.02
"""Wall seconds between two views where time is virtual: a night in a minute is not shown a thousand times a second."""
SILENT_S = 30.0
"""Longer without telemetry is trouble; a link gets over shorter cuts by itself."""
LOST_SPREAD_M, LOST_S = 3.0, 60.0
"""A robot that knows its position no better than this for so long is lost, whatever the retry rule has tried."""
MAY_NOT_HAVE_BEEN_TOLD = "The mission has ended, but the robot may not have been told. See that it stands."
SNAPSHOT_S = 600.0
"""Seconds of the run between two snapshots: the most that picking it up has to go through again."""
RECORD_AGAIN_S = 5.0
"""Between two attempts at a record that cannot be written, where no person asks for one."""


@dataclass(frozen=True, slots=True)
class _Made:
    """What the engine made of an input, not yet recorded."""

    given: Input
    state: EngineState
    effects: Sequence[Effect]


@dataclass(slots=True)
class Host:
    """One run, from begin to end. `pace` is virtual seconds per wall second, None for as fast as it goes.

    `after_turn` is called in the host's own thread after each turn. `alone` says for how many wall seconds nobody has
    watched. `state` is the initial one, or the one in which a run is picked up. `held_pace` is the pace while a person
    holds the robot; `rest` is how many wall seconds a run in trouble waits between two looks.
    """

    machine: Machine
    state: EngineState
    backend: Backend
    journal: JournalWriter
    board: Board
    distress: Distress
    seed: int = 0
    pace: float | None = None
    after_turn: Callable[[], None] = lambda: None
    alone: Callable[[], float] = lambda: 0.0
    held_pace: float | None = HELD_PACE
    rest: float = SLICE_S
    gate: Gate = field(init=False)
    _pacer: Pacer = field(init=False)
    _wall: WallWatch = field(init=False)
    _unrecorded: _Made | None = field(default=None, init=False)
    _snapshot_due: float = field(default=SNAPSHOT_S, init=False)
    _view_due: float = field(default=0.0, init=False)
    _quiet_from: float = field(default=0.0, init=False)
    _lost_since: float | None = field(default=None, init=False)
    _told_at: float = field(default=0.0, init=False)

    def __post_init__(self) -> None:
        clock = self.backend.clock
        self.gate = Gate(self.backend)
        self._pacer = Pacer(self.pace if clock.virtual else None, clock.now(), self.held_pace)
        self._wall = WallWatch(clock)
        self._snapshot_due = clock.now() + SNAPSHOT_S
        self._quiet_from = clock.now()

    def run(self) -> Ending:
        """Run the mission to its end. Whatever goes wrong, the robot is told to halt before this returns or raises.

        The backend must be open. RunError where the robot or the record failed and nobody mended it in time.
        """
        clock = self.backend.clock
        begin = Begin(clock.now(), seconds_of_day(clock.wall()), self.seed)
        return self._live(lambda: self._safely(self._give, begin))

    def go_on(self, who: str, down: float, again: Sequence[Command]) -> Ending:
        """Go on with a run whose process died: `again` is sent again, with the same ids.

        `state` is the one that the record leads to; `down` is for how many wall seconds nobody was in charge. An
        action whose answer may be lost counts as failed: to ask twice to ease back would be to do it twice. Raises
        as `run`.
        """
        clock, action = self.backend.clock, self.state.action
        midnight = seconds_of_day(clock.wall()) - clock.now()
        days = round((self.state.clock + down - midnight) / DAY_S)
        picked_up = PickedUp(clock.now(), who, midnight + days * DAY_S, down)

        def first() -> None:
            self._safely(self._send, again)  # first, because being picked up may let a timer run out
            self._safely(self._give, picked_up)
            if action is not None:
                lost = ActionNews(clock.now(), action, False, "The program was started anew meanwhile.")
                self._safely(self._give, lost)

        return self._live(first)

    def _live(self, begin: Callable[[], None]) -> Ending:
        try:
            begin()
            while self.state.ended is None:
                self._safely(self._turn)
            self._post_view()
            return self.state.ended
        except BaseException:
            self.gate.try_halt()
            raise

    # --- one turn -------------------------------------------------------------------------------------------------

    def _turn(self) -> None:
        """One look at everything: wishes, reports up to the next deadline, timers."""
        self._wishes()
        clock = self.backend.clock
        deadline = next_deadline(self.machine, self.state)
        until = clock.now() + self._slice()
        if deadline is not None:
            until = min(until, deadline)
        reports = self.gate.reports(until)
        for report in reports:
            self._wishes(waiting=False)
            self._give(to_input(report))
        self._keep_truths()
        if deadline is not None and (clock.now() >= deadline or (not reports and until >= deadline)):
            self._give(Tick(max(deadline, clock.now())))
        self._look_around()
        if clock.virtual:
            self._pacer.hold(self.state.held is not None, clock.now())
        if self._is_view_due(bool(reports)):
            self._post_view()
        self.after_turn()

    def _keep_truths(self) -> None:
        """Journal what really was the case in a simulated world. Nothing here ever looks at it."""
        for truth in self.gate.truths():
            self.journal.truth(truth.stamp, truth.pose, truth.cause.value)

    def _is_view_due(self, news: bool) -> bool:
        clock = self.backend.clock
        now, between = (time.monotonic(), VIEW_REAL_S) if clock.virtual else (clock.now(), VIEW_S)
        if now < self._view_due and (clock.virtual or not news):
            return False
        self._view_due = now + between
        return True

    def _wishes(self, waiting: bool = True) -> None:
        """Carry out what people ask for; wait for it as long as virtual time is ahead of the pace."""
        clock = self.backend.clock
        while (wish := self.board.next_wish(self._pacer.ahead(clock.now()) if waiting else 0.0)) is not None:
            self._carry_out(wish)

    def _carry_out(self, wish: Wish) -> None:
        if wish.event is Event.ABORT:
            self._abort()
        try:
            effects = self._give(wished(wish, self.backend.clock.now()))
        except (JournalError, RobotError) as error:
            wish.answered(False, str(error))
            raise
        accepted = any(map(is_acceptance, effects))
        if accepted and wish.event is Event.RELEASE:
            self._released()
        wish.answered(accepted, "done" if accepted else "no effect now")

    def _abort(self) -> None:
        """Halt before anything is recorded. Where that fails, the command that follows will say so."""
        with contextlib.suppress(RobotError):
            self.gate.abort()

    def _slice(self) -> float:
        """How long the backend may be asked to go on without a look at wishes, in seconds of its clock."""
        pace = self._pacer.pace
        if not self.backend.clock.virtual:
            return SLICE_REAL_S
        return SLICE_UNPACED_S if pace is None else SLICE_S * pace

    def _give(self, given: Input) -> Sequence[Effect]:
        """One input through the engine, into the journal, and out to the robot. What came of it."""
        made = _Made(given, *advance(self.machine, self.state, given))
        self._unrecorded = made
        self._record(made)
        self._send(effect for effect in made.effects if type(effect) in SENDERS)
        return made.effects

    def _record(self, made: _Made) -> None:
        """Commit what the engine made; from then on it is so. JournalError, and nothing has changed, where it fails."""
        given, effects = made.given, made.effects
        if isinstance(given, Seen):
            self.journal.track(given, effects)
        else:
            self.journal.write(given.stamp, [given, *effects])
        self.state = made.state
        self._unrecorded = None
        self._tell(given.stamp, effects)
        if given.stamp >= self._snapshot_due:
            self._snapshot_due = given.stamp + SNAPSHOT_S
            hours = self.distress.care.track_hours
            with contextlib.suppress(JournalError):  # a shortcut only; the next entry will say that there is no room
                self.journal.snapshot(given.stamp, state_to_bytes(self.state), hours and hours * 3600.0)

    def _send(self, commands: Iterable[Any]) -> None:
        for command in commands:
            self.gate.command(SENDERS[type(command)], command)

    def _tell(self, stamp: float, effects: Sequence[Effect]) -> None:
        clock = clock_text(self.state.clock + stamp)
        for effect in effects:
            if (line := feed_line(effect, stamp, clock)) is not None:
                self.board.post_line(line)

    def _post_view(self) -> None:
        view = view_of(self.machine, self.state, self.backend.clock.now())
        if (quality := self.gate.quality()) is not None:
            view = replace(view, line=quality)
        if self.distress.kind and self.state.ended is None:
            view = replace(view, health=Health.NEEDS_YOU, reason=self.distress.detail)
        self.board.post_view(view)

    # --- trouble --------------------------------------------------------------------------------------------------

    def _look_around(self) -> None:
        """Trouble that does not come by itself: silence, a lost robot, nobody watching, a clock that was set."""
        now, seen = self.backend.clock.now(), self.state.seen
        if moved := self._wall.moved():
            self._give(ClockMoved(now, moved))
        if self.state.held is not None or self.state.ended is not None:
            self._quiet_from, self._lost_since = now, None
            return
        heard = max(self._quiet_from, seen.stamp if seen else 0.0)
        if now - heard > SILENT_S:
            self._trouble("robot silent", f"Nothing has been heard from the robot for {now - heard:.0f} s.")
        if seen is None or seen.spread <= LOST_SPREAD_M:
            self._lost_since = None
        elif self._lost_since is None:
            self._lost_since = now
        elif now - self._lost_since > LOST_S:
            self._trouble("robot lost", f"The robot knows its position to {seen.spread:.1f} m only.")
        attended = self.distress.care.attended
        if attended is not None and min(self.alone(), time.monotonic() - self._told_at) > attended:
            self._hold_for("nobody watches", f"Nobody has watched the run for {attended:g} s.")

    def _safely(self, action: Callable[..., object], *arguments: object) -> None:
        """Do something; what goes wrong becomes trouble of a kind."""
        try:
            action(*arguments)
        except JournalError as error:
            self._trouble("record", f"The record cannot be written: {error}", error)
        except RobotError as error:
            self._trouble("robot", str(error), error)
        except RunError:
            raise
        except Exception as error:
            self._trouble("program", f"A fault of Trundle's own: {type(error).__name__}: {error}", error)

    def _trouble(self, kind: str, detail: str, error: BaseException | None = None) -> None:
        """Halt, note, tell, hold; wait for the record to be mended if that is what is wrong. RunError where the run
        cannot go on, or is not to wait."""
        again = kind == self.distress.kind and self.state.held is not None
        unreached = self.gate.try_halt()
        self.distress.begin(kind, detail, self.backend.clock.now(), error)
        if self.state.ended is not None and kind == "robot":
            raise RunError(f"{detail} {MAY_NOT_HAVE_BEEN_TOLD}")
        if self.state.ended is not None:
            raise RunError(detail) from error
        if kind == "record":
            self._await_record()
        elif again:
            self._rest()
        else:
            self._unrecorded = None
            self._hold_for(kind, f"{detail} {unreached}" if unreached and kind != "robot" else detail)
        if self.distress.impatient:
            raise RunError(detail) from error

    def _hold_for(self, kind: str, detail: str) -> None:
        """Hold the mission in nobody's name. A robot that cannot be told to halt has been tried before."""
        self.distress.begin(kind, detail, self.backend.clock.now())
        try:
            with contextlib.suppress(RobotError):
                self._give(Trouble(self.backend.clock.now(), kind, detail))
        except JournalError as error:
            self._trouble("record", f"The record cannot be written: {error}", error)
        except RunError:
            raise
        except Exception as error:
            raise RunError(f"{detail} Holding the mission failed too: {type(error).__name__}: {error}") from error
        self._post_view()

    def _released(self) -> None:
        self.distress.over()
        self._told_at = time.monotonic()
        self._quiet_from = self.backend.clock.now()

    def _rest(self) -> None:
        """Nothing has changed: look again in a while."""
        time.sleep(self.rest)
        self._post_view()
        self.after_turn()

    def _await_record(self) -> None:
        """Wait until what could not be recorded can be; then hold the mission. The robot stands meanwhile."""
        kind, detail = self.distress.kind, self.distress.detail
        again_at = time.monotonic() + RECORD_AGAIN_S
        while True:
            self._post_view()
            self.after_turn()
            wish = self._wish_that_matters(detail)
            if self.distress.impatient:
                raise RunError(detail)
            if wish is not None or time.monotonic() >= again_at:
                aborts = wish is not None and wish.event is Event.ABORT
                if aborts:
                    self._abort()
                again_at = time.monotonic() + RECORD_AGAIN_S
                if self._recorded_now():
                    break
                if wish is not None and aborts:
                    self._abort_unrecorded(wish)
                if wish is not None:
                    wish.answered(False, detail)
            self._drain()
        if self.state.ended is None:
            self._hold_for(kind, detail)
        elif unreached := self.gate.try_halt():  # an abort that could be recorded only now: its halt may be lost
            raise RunError(f"{unreached} {MAY_NOT_HAVE_BEEN_TOLD}")
        if wish is not None:
            self._safely(self._carry_out, wish)

    def _wish_that_matters(self, detail: str) -> Wish | None:
        """The next wish to release or to abort, where there is one; all others are turned down, however many."""
        wish = self.board.next_wish(self.rest)
        while wish is not None and wish.event not in (Event.RELEASE, Event.ABORT):
            wish.answered(False, detail)
            wish = self.board.next_wish(0.0)
        return wish

    def _abort_unrecorded(self, wish: Wish) -> None:
        """End the run although the record cannot say so. A note beside it keeps it from being picked up."""
        self.distress.mark_aborted(wish.who)
        wish.answered(True, "done, but it cannot be recorded")
        raise RunError(f"{self.distress.detail} Aborted by {wish.who}.")

    def _recorded_now(self) -> bool:
        """Try again to record what could not be. Its commands are not sent: the robot is halted, and held next."""
        try:
            if self._unrecorded is not None:
                self._record(self._unrecorded)
        except JournalError:
            return False
        return True

    def _drain(self) -> None:
        """Listen to a real robot while nothing of it can be recorded, so that the link to it stays up."""
        if not self.backend.clock.virtual:
            with contextlib.suppress(RobotError):
                self.gate.reports(self.backend.clock.now() + SLICE_S)
