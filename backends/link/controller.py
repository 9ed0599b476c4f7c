"""The controller's side of the link without its socket: commands and frames in, frames and reports out.

Whatever the line does, it keeps the rules of `backends.contract`: each goal that was given ends once or is replaced,
each action is answered once, and stamps never fall. What the robot's `state` says is the truth; news is the difference
between two states, so a lost message loses nothing. When the robot has stopped because it did not hear from here, the
same goal is sent again under the same id. When its program was started again and forgot a goal that it may have had,
that goal has failed: it may have been driven to its end, and no goal is driven twice.
"""

from __future__ import annotations

import secrets
from collections import deque
from collections.abc import Callable, Sequence

from backends.contract import ActionReport, BackendError, Goal, GoalReport, GoalStatus, Report
from backends.link.duty import stand_of
from backends.link.messages import (
    ENDS,
    VERSION,
    About,
    Beat,
    Command,
    Done,
    Fault,
    FromRobot,
    Go,
    GoalState,
    Granted,
    Halt,
    Hello,
    Leave,
    MessageError,
    Seen,
    State,
    Take,
    ToRobot,
    encode,
    read_by_controller,
    read_by_robot,
)
from backends.link.orders import Making, Order, Orders
from backends.link.quality import Line
from backends.link.sightings import Sightings

ASK_S = 0.5
"""Time between two requests for the lease, or two greetings."""
BEAT_S = 0.2
TAKEN_PATIENCE_S = 10.0
"""A robot that somebody else controls for this long is not ours any more."""
LOSSES_MOST, LOSSES_WITHIN_S = 4, 20.0
"""A lease that is lost this often within that time is being taken by another program of the same session."""

HALTED = "The robot was halted."
RESTARTED = "The robot's program was started again."
FORGOTTEN = "The robot's program was started again and does not know its goal any more."


class Controller:
    """One session with one robot. `clock` gives seconds that never fall; `session` never repeats between runs."""

    def __init__(
        self,
        session: str,
        name: str,
        clock: Callable[[], float],
        every: float = 0.25,
        window: int = 8,
        token: Callable[[], str] = lambda: secrets.token_hex(16),
    ) -> None:
        self.about: About | None = None
        self.line = Line()
        self.dropped = 0
        """Frames that were no messages, or of no use."""
        self.session = session
        self._name = name
        self._clock = clock
        self._every, self._window = every, window
        self._token = token
        self._orders = Orders()
        self._sightings = Sightings(self.line)
        self._reports: list[Report] = []
        self._lease: Granted | None = None
        self._nonce = token()
        self._boot = ""
        self._state: State | None = None
        self._heard = 0.0
        self._next_ask = 0.0
        self._next_beat = 0.0
        self._newest_goal = -1
        self._goal: Goal | None = None
        self._status: str | None = None
        self._goal_boot = ""
        """The boot of the robot to which the goal was sent first; empty before that."""
        self._stopped_goal: int | None = None
        self._actions: dict[int, bool] = {}
        """Open actions, and whether a halt came after them."""
        self._halt_answered: float | None = None
        self._good_at = 0.0
        self._taken_since: float | None = None
        self._losses: deque[float] = deque(maxlen=LOSSES_MOST)
        self._leaving = False

    @property
    def ready(self) -> bool:
        """Whether the lease is held and the robot's state is known."""
        return self._lease is not None and self._state is not None

    @property
    def settled(self) -> bool:
        """Whether no command waits for its answer."""
        return self._orders.first is None

    @property
    def state(self) -> State | None:
        """What the robot said last."""
        return self._state

    # --- commands

    def go(self, goal: Goal) -> None:
        """Drive to a goal, in place of the one before. An id that was given before changes nothing."""
        if goal.id <= self._newest_goal:
            return
        self._newest_goal = goal.id
        self._orders.drop_goals()
        self._goal, self._status, self._goal_boot = goal, None, ""
        self._send_goal(goal)

    def _send_goal(self, goal: Goal) -> None:
        pose = stand_of(goal.pose)

        def make(lease: str, number: int, heard: float) -> Go:
            return Go(lease, number, heard, goal.id, pose, goal.speed, goal.relative)

        self._order(make, goal=goal.id)

    def act(self, action: int, make: Making) -> None:
        """Begin an action; `make` makes its command."""
        self._actions[action] = False
        self._order(make, action=action)

    def order(self, make: Making) -> None:
        """Send a command that nothing waits for, and that has no values of the caller's in it."""
        self._orders.add(Order(make))

    def _order(self, make: Making, goal: int | None = None, action: int | None = None) -> None:
        order = Order(make, goal, action)
        try:
            read_by_robot(encode(make("0" * 32, 1, 0.0)))
        except MessageError as error:
            self._refused(order, f"The command cannot be sent: {error.what}")
        else:
            self._orders.add(order)

    def halt(self) -> None:
        """Stop, before all else. What was not sent yet ends here, unless the robot may have it from a program before
        this one, whose state is not known yet; the rest ends when the robot says so."""
        self._halt_answered = None
        self._actions = dict.fromkeys(self._actions, True)
        self._stopped_goal = None if self._goal is None else self._goal.id
        for order in self._orders.halt(Order(lambda lease, number, _: Halt(lease, number))):
            if order.number is None and (order.goal is None or self._state is not None):
                self._refused(order, HALTED, GoalStatus.HALTED)

    def leave(self) -> None:
        """Give the lease back, and never ask for it again."""
        self._leaving = True
        self._orders.halt(Order(lambda lease, number, _: Leave(lease, number)))

    def _refused(self, order: Order, reason: str, status: GoalStatus = GoalStatus.REFUSED) -> None:
        """What waited for this order hears that nothing came of it."""
        stamp = self._sightings.stamp_now(self._clock())
        if order.goal is not None and self._goal is not None and order.goal == self._goal.id:
            self._end_goal(GoalReport(stamp, order.goal, status, "" if status is GoalStatus.HALTED else reason))
        if order.action is not None and self._actions.pop(order.action, None) is not None:
            self._reports.append(ActionReport(stamp, order.action, False, reason))

    def _end_goal(self, report: GoalReport) -> None:
        self._reports.append(report)
        self._goal = self._status = None

    # --- frames out

    def due(self) -> list[bytes]:
        """The frames to send now."""
        now = self._clock()
        messages: list[ToRobot] = []
        if self.about is None or self._lease is None:
            if now >= self._next_ask and not self._leaving:
                self._next_ask = now + ASK_S
                messages.append(self._asking())
        else:
            command = self._command_due(self._lease, now)
            if command is not None:
                messages.append(command)
            if now >= self._next_beat and not self._orders.halting:  # a halt that is lost must end in silence
                messages.append(self._beat(self._lease, now))
        return [encode(message) for message in messages]

    def _command_due(self, lease: Granted, now: float) -> Command | None:
        """The command to send now. After a start of the robot's program only a halt goes before its first state."""
        if self._state is None and not self._orders.halting:
            return None
        command = self._orders.due(lease.lease, self._heard, now)
        if isinstance(command, Go) and not self._goal_boot:
            self._goal_boot = lease.boot
        return command

    def _asking(self) -> Hello | Take:
        if self.about is None:
            return Hello([VERSION])
        return Take(VERSION, self.session, self._nonce, self._name, self._every, self._window)

    def _beat(self, lease: Granted, now: float) -> Beat:
        self._next_beat = now + min(BEAT_S, lease.silence / 5.0)
        self.line.beat(now)
        return Beat(lease.lease, now, self._heard, self._sightings.seen)

    def next_due(self) -> float:
        """When `due` has something to send, if nothing else happens."""
        if self.about is None or self._lease is None:
            return self._next_ask
        order = self._orders.first
        if order is not None and self._orders.halting:
            return order.next_send
        return self._next_beat if order is None or self._state is None else min(self._next_beat, order.next_send)

    # --- frames in

    def receive(self, frame: bytes) -> None:
        """Take in one frame. BackendError where the robot is not to be had."""
        try:
            message = read_by_controller(frame)
        except MessageError:
            self.dropped += 1
            return
        self._take_in(message, self._clock())

    def _take_in(self, message: FromRobot, now: float) -> None:
        match message:
            case About():
                self._meet(message)
            case Granted():
                self._granted(message, now)
            case State():
                self._told(message, now)
            case Seen():
                if self._sightings.take(message, now):
                    self._heard = max(self._heard, message.stamp)
            case Done():
                self._answered(message, now)
            case Fault():
                self._fault(message, now)

    def _meet(self, about: About) -> None:
        if VERSION not in about.versions:
            versions = ", ".join(map(str, about.versions))
            raise BackendError(f"The robot speaks version {versions} of the protocol, this program version {VERSION}.")
        if self.about is None:
            self.about = about
            self._next_ask = 0.0

    def _granted(self, granted: Granted, now: float) -> None:
        if granted.nonce != self._nonce or self._lease is not None:
            return
        self._lease = granted
        self._nonce = self._token()
        self._good_at, self._taken_since = now, None
        self._next_beat = 0.0
        if granted.boot != self._boot:
            self._booted(granted, now)
        self._heard = max(self._heard, granted.stamp)
        self._orders.begin_anew()

    def _booted(self, granted: Granted, now: float) -> None:
        """The first lease, or the robot's program was started again: its clock and its counters began anew."""
        self._boot = granted.boot
        self._state = None
        self._heard = 0.0
        self._sightings.begin_anew()
        self.line.guess(granted.stamp, now)
        for action in [action for action in self._actions if not self._orders.waits_for_action(action)]:
            del self._actions[action]
            self._reports.append(ActionReport(self._sightings.stamp_now(now), action, False, RESTARTED))

    def _answered(self, done: Done, now: float) -> None:
        order = self._orders.answered(done.number)
        if order is None:
            return
        self._good_at, self._taken_since = now, None
        if order.goal is None and order.action is None and self._stopping:
            self._halt_answered = now
        if done.outcome in ("not able", "overtaken"):
            self._refused(order, done.reason)
        elif done.outcome == "old":
            self._refused(order, done.reason, GoalStatus.FAILED)

    @property
    def _stopping(self) -> bool:
        """Whether something waits for what becomes of it after a halt."""
        return not self._orders.halting and (self._stopped_goal is not None or any(self._actions.values()))

    def _fault(self, fault: Fault, now: float) -> None:
        quiet = now - self._good_at > ASK_S
        if self._leaving and fault.code == "no lease" and fault.number is not None:
            self._orders.answered(fault.number)  # it was given back, and only the answer was lost
            return
        if fault.code == "version":
            raise BackendError(f"The robot refuses: {fault.what}")
        if fault.code == "taken":
            self._taken_since = now if self._taken_since is None else self._taken_since
            if now - self._taken_since > TAKEN_PATIENCE_S:
                raise BackendError("Another controller has taken the robot.")
        elif fault.code == "no lease" and self._lease is not None and quiet:
            self._lease_lost(now)
        elif fault.code not in ("no lease", "too old"):
            self.dropped += 1

    def _lease_lost(self, now: float) -> None:
        """Ask for it again, unless somebody of the same session keeps asking too."""
        self._losses.append(now)
        if len(self._losses) == LOSSES_MOST and now - self._losses[0] < LOSSES_WITHIN_S:
            raise BackendError("Another program drives the robot for this same run.")
        self._lease = None
        self._next_ask = 0.0

    # --- what the robot says

    def _told(self, state: State, now: float) -> None:
        if state.boot != self._boot or (self._state is not None and state.number <= self._state.number):
            return
        if state.echo is not None:
            self.line.echo(state.echo, state.stamp, now)
        self._good_at, self._taken_since = now, None
        if state.stamp - self._heard > 0.5:
            self._orders.hurry()
        self._state = state
        self._heard = max(self._heard, state.stamp)
        self._sightings.skip_to(state.telemetry)
        self._compare_goal(state)
        self._compare_actions(state)
        if self._halt_answered is not None and state.echo is not None and state.echo >= self._halt_answered:
            self._after_halt(now)

    def _compare_goal(self, state: State) -> None:
        goal, told = self._goal, state.goal
        if goal is None:
            return
        if told is not None and told.id == goal.id:
            self._goal_told(told)
        if self._goal is None or self._stopped_goal == goal.id:
            return
        unknown = told is None or told.id < goal.id
        if unknown and self._goal_boot not in ("", state.boot):
            self._orders.drop_goals()
            self._end_goal(GoalReport(self._sightings.stamp_now(self._clock()), goal.id, GoalStatus.FAILED, FORGOTTEN))
        elif not self._orders.waits_for(goal.id) and (unknown or state.suspended):
            self._send_goal(goal)

    def _goal_told(self, told: GoalState) -> None:
        if told.status == self._status:
            return
        self._status = told.status
        stamp = self._sightings.stamp_of(told.stamp, self._clock())
        report = GoalReport(stamp, told.id, GoalStatus(told.status), told.reason)
        if told.status in ENDS:
            self._end_goal(report)
        else:
            self._reports.append(report)

    def _compare_actions(self, state: State) -> None:
        for ended in state.actions:
            if self._actions.pop(ended.id, None) is not None:
                stamp = self._sightings.stamp_of(ended.stamp, self._clock())
                self._reports.append(ActionReport(stamp, ended.id, ended.done, ended.reason))

    def _after_halt(self, now: float) -> None:
        """The robot was heard after it had halted: what it still says nothing about never reached it."""
        told = self._state.goal if self._state is not None else None
        stamp = self._sightings.stamp_now(now)
        goal = self._goal
        if goal is not None and goal.id == self._stopped_goal:
            if told is not None and told.id == goal.id and told.status not in ENDS:
                return
            self._end_goal(GoalReport(stamp, goal.id, GoalStatus.HALTED))
        for action in [action for action, stopped in self._actions.items() if stopped]:
            del self._actions[action]
            self._reports.append(ActionReport(stamp, action, False, HALTED))
        self._halt_answered = self._stopped_goal = None

    # --- reports

    def reports(self) -> Sequence[Report]:
        """What is new since the last call: the newest telemetry only, and everything else in order."""
        taken: list[Report] = list(self._reports)
        self._reports.clear()
        if (telemetry := self._sightings.newest()) is not None:
            taken.append(telemetry)
        return taken
