"""What the robot's side has its adapter do: drives for goals, tasks for actions, and stopping when nobody is there.

The adapter knows drives by ids of its own, a new one each time a goal begins or goes on, so that what it says of a
drive that was given up is told apart from what it says of the one that took its place.
"""

from __future__ import annotations

from math import cos, remainder, sin, tau

from backends.contract import Telemetry
from backends.link.adapter import Adapter, Doing, Drive, DriveNews, Standing, Task
from backends.link.ledger import Ledger
from backends.link.messages import Action, Clear, Done, EaseBack, Go, GoalState, Replan, Stand
from runner.site.values import Pose

STILL_M_S, STILL_RAD_S = 0.01, 0.02
"""Slower than this a robot stands."""
NOBODY = "The controller was silent."

_DOINGS: dict[type[Action], Doing] = {Clear: Doing.CLEAR, Replan: Doing.REPLAN, EaseBack: Doing.EASE_BACK}


class Duty:
    """The one goal and the actions under way. `changed` is set where the controller ought to be told at once."""

    def __init__(self, adapter: Adapter, ledger: Ledger) -> None:
        self.ledger = ledger
        self.abilities = adapter.describe().abilities
        self.suspended = False
        self.changed = False
        self._adapter = adapter
        self._ids = 0
        self._drive: int | None = None
        self._halting = False
        """Whether the goal was halted, and the robot may not stand yet."""
        self._tasks: dict[int, int] = {}
        """Action ids of the session by the adapter's ids of the tasks under way."""

    @property
    def active(self) -> bool:
        """Whether the robot may be moving for its controller."""
        return self._drive is not None or bool(self._tasks)

    def resume_session(self, name: str) -> None:
        """A lease for this session begins: what was under way for another ends, its own waits to be asked for."""
        before = self.ledger.current
        if self.ledger.open(name) is not before:
            self._stand()
            self._tasks.clear()
        self.suspended = self._drive is None and self.ledger.current.goal_open

    def go(self, command: Go, now: float) -> Done:
        """Drive to a goal, unless its id says that it is old, under way or over."""
        session = self.ledger.current
        newest = session.goal
        if newest is not None and command.goal < newest.id:
            return Done(command.number, "old", f"Goal {newest.id} came after it.")
        if newest is not None and command.goal == newest.id:
            return self._go_on(command, newest)
        if command.relative and "relative moves" not in self.abilities:
            return Done(command.number, "not able", "This robot cannot move relative to where it stands.")
        target = beyond(self._adapter.look().pose, command.pose) if command.relative else command.pose
        self.ledger.dirty = True
        session.goal = GoalState(command.goal, "accepted", "", now, target)
        session.speed, session.relative = command.speed, command.relative
        self._begin(command.pose)
        return Done(command.number, "taken")

    def _go_on(self, command: Go, newest: GoalState) -> Done:
        """The same goal again: drive on where the controller's silence broke it off, and else change nothing."""
        if not (self.suspended and self.ledger.current.goal_open):
            return Done(command.number, "known", f"It is {newest.status}.")
        session = self.ledger.current
        session.speed, session.relative = command.speed, command.relative
        pose = seen_from(self._adapter.look().pose, newest.pose) if command.relative else newest.pose
        self._begin(pose)
        return Done(command.number, "taken")

    def _begin(self, pose: Stand) -> None:
        session = self.ledger.current
        self._ids += 1
        self._drive = self._ids
        self.suspended = self._halting = False
        self.changed = True
        self._adapter.drive(Drive(self._drive, Pose(*pose), session.speed, session.relative))

    def act(self, command: Action, now: float) -> Done:
        """Begin an action, unless its id was seen before."""
        session = self.ledger.current
        if command.action <= session.highest_action:
            if command.action not in self._tasks.values():
                self.ledger.action_ended(command.action, False, "It was broken off.", now)
                self.changed = True
            return Done(command.number, "known")
        doing = _DOINGS.get(type(command), Doing.RELOCATE)
        if doing.value not in self.abilities:
            return Done(command.number, "not able", f"This robot has no ability called {doing.value}.")
        session.highest_action = command.action
        self.ledger.dirty = True
        self._ids += 1
        self._tasks[self._ids] = command.action
        self._adapter.start(_task(self._ids, command, doing))
        return Done(command.number, "taken")

    def charge(self, number: int) -> Done:
        """Begin charging."""
        if Doing.CHARGE.value not in self.abilities:
            return Done(number, "not able", "This robot cannot charge.")
        self._adapter.start(Task(0, Doing.CHARGE))
        return Done(number, "taken")

    def halt(self, now: float) -> None:
        """Stop. The goal ends when the adapter says that the robot stands; one that was suspended ends now."""
        self._adapter.stop()
        self._halting = True
        if self._drive is None:
            self.ledger.goal_is("halted", "", now)
            self.suspended = False
        self.changed = True

    def suspend(self, now: float) -> None:
        """The controller is silent: stop, and keep the goal for when it is asked for again, unless it was halted."""
        self._stand()
        if self._halting:
            self.ledger.goal_is("halted", "", now)
        self.suspended = self.ledger.current.goal_open
        self.changed = True

    def abandon(self, reason: str, now: float) -> None:
        """The lease is over: stop, and end the goal."""
        self._stand()
        self.ledger.goal_is("halted", reason, now)
        self.suspended = False

    def _stand(self) -> None:
        self._adapter.stop()
        self._drive = None

    def take_news(self, now: float) -> None:
        """Ask the adapter what began and ended."""
        for news in self._adapter.news():
            if not isinstance(news, DriveNews):
                if (action := self._tasks.pop(news.id, None)) is None:
                    continue
                self.ledger.action_ended(action, news.done, news.reason, now)
            elif news.id == self._drive:
                self.ledger.goal_is(news.standing.value, news.reason, now)
                self._drive = self._drive if news.standing is Standing.UNDER_WAY else None
            else:
                continue
            self.changed = True

    def look(self) -> Telemetry:
        """What the robot believes and senses now."""
        return self._adapter.look()


def still(seen: Telemetry) -> bool:
    """Whether the robot stands."""
    return abs(seen.speed) < STILL_M_S and abs(seen.turn_rate) < STILL_RAD_S


def stand_of(pose: Pose) -> Stand:
    """A pose as the messages carry it: the heading within half a turn of 0."""
    return (pose.x, pose.y, remainder(pose.heading, tau))


def beyond(pose: Pose, step: Stand) -> Stand:
    """Where a step seen from a pose leads, in the frame of the pose."""
    ahead, left, turn = step
    c, s = cos(pose.heading), sin(pose.heading)
    return (pose.x + c * ahead - s * left, pose.y + s * ahead + c * left, remainder(pose.heading + turn, tau))


def seen_from(pose: Pose, target: Stand) -> Stand:
    """A target as it is seen from a pose: the step that leads there."""
    dx, dy = target[0] - pose.x, target[1] - pose.y
    c, s = cos(pose.heading), sin(pose.heading)
    return (c * dx + s * dy, c * dy - s * dx, remainder(target[2] - pose.heading, tau))


def _task(number: int, command: Action, doing: Doing) -> Task:
    match command:
        case Clear():
            return Task(number, doing, command.radius)
        case EaseBack():
            return Task(number, doing, command.distance)
        case Replan():
            return Task(number, doing)
        case _:
            return Task(number, doing, 0.0, None if command.pose is None else Pose(*command.pose))
