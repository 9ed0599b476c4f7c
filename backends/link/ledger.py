"""What the robot's side remembers of goals and actions, so that none is driven twice and none is lost.

Goals are known by session and id. Within a session ids count up: an id below the newest is old and never driven, and
the newest is driven at most once, but for going on after the controller was silent. A session that ends leaves its
newest goal here, for a controller that comes back late. `Kept` is what outlives a restart of the robot's program.
"""

from __future__ import annotations

from collections import OrderedDict
from dataclasses import dataclass

from msgspec import Struct

from backends.link.messages import ENDS, ActionState, GoalState, Progress

SESSIONS_KEPT = 16
ACTIONS_KEPT = 16


class Kept(Struct, frozen=True):
    """What a robot's program may write to a file and be given again when it starts: the newest goal of each session."""

    goals: dict[str, GoalState] = {}
    actions: dict[str, int] = {}


@dataclass(slots=True)
class Session:
    """The goals and actions of one session."""

    goal: GoalState | None = None
    speed: float = 0.0
    relative: bool = False
    highest_action: int = 0
    ended_actions: tuple[ActionState, ...] = ()

    @property
    def goal_open(self) -> bool:
        """Whether the newest goal has not ended."""
        return self.goal is not None and self.goal.status not in ENDS


class Ledger:
    """The sessions that are remembered, the one in force last."""

    def __init__(self, kept: Kept | None = None) -> None:
        self._sessions: OrderedDict[str, Session] = OrderedDict()
        for name, goal in (kept.goals if kept else {}).items():
            self._sessions[name] = Session(goal=goal, highest_action=kept.actions.get(name, 0) if kept else 0)
        self.current = Session()
        self.dirty = False
        """Whether something worth keeping changed; whoever keeps it sets this back."""

    def open(self, name: str) -> Session:
        """Make a session the one in force, as it was left."""
        self.current = self._sessions.setdefault(name, Session())
        self._sessions.move_to_end(name)
        while len(self._sessions) > SESSIONS_KEPT:
            self._sessions.popitem(last=False)
        return self.current

    def kept(self) -> Kept:
        """What is worth keeping over a restart."""
        goals = {name: session.goal for name, session in self._sessions.items() if session.goal is not None}
        return Kept(goals, {name: session.highest_action for name, session in self._sessions.items()})

    def goal_is(self, status: Progress, reason: str, stamp: float) -> None:
        """The newest goal got on, or ended. Once ended it stays as it is."""
        goal = self.current.goal
        if goal is not None and goal.status not in ENDS:
            self.current.goal = GoalState(goal.id, status, reason[:300], stamp, goal.pose)
            self.dirty = True

    def action_ended(self, action: int, done: bool, reason: str, stamp: float) -> None:
        """An action has its one answer."""
        session = self.current
        if all(ended.id != action for ended in session.ended_actions):
            ended = ActionState(action, done, reason[:300], stamp)
            session.ended_actions = (*session.ended_actions, ended)[-ACTIONS_KEPT:]
