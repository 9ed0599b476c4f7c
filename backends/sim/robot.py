"""What the robot's own program does: it holds a goal, plans, follows, supervises its route, and answers commands.

It knows the map, its memory and where it believes it is, never the world. Commands change what it is about; `think`,
once a tick, says what speeds it wants. News for whoever commands it collects in `news`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.contract import ActionReport, Goal, GoalReport, GoalStatus, Report
from backends.sim.body import Body
from backends.sim.caution import Caution
from backends.sim.easing import Easing
from backends.sim.memory import Memory
from backends.sim.moves import MIDDLE, Move, square_of
from backends.sim.parts import STAND, Wish, follower_named, planner_named
from backends.sim.planner import Planner, Route
from backends.sim.tracking import Track
from runner.site.values import Pose, UnseenSpace

PATIENCE_S = 1.0
"""An obstruction of the route must last this long before a new one is planned: people walk by."""
BETWEEN_ATTEMPTS_S = 1.0
ATTEMPTS = 4
"""Planning fails this often, so far apart, before the robot says that there is no route."""
ASTRAY_M = 0.8
"""Farther beside its route than this the robot plans anew."""


@dataclass(frozen=True, slots=True)
class _Ending:
    """How the goal will end once the robot stands."""

    status: GoalStatus
    reason: str


class Robot:
    """The mind of the simulated robot. `pose` is where it believes it is."""

    def __init__(self, body: Body, memory: Memory, pose: Pose) -> None:
        self.memory = memory
        self.pose = pose
        self.news: list[Report] = []
        self.route: Route | None = None
        self.route_number = 0
        self.track = Track()
        self.caution = Caution(body.drive.limits, body.outline, memory)
        self._body = body
        limits = body.drive.limits
        self._follower = follower_named(limits.follower)(body.outline, body.drive)
        self._planner = Planner(body.outline, planner_named(limits.planner)(body.outline, memory.known))
        self._easing = Easing(body)
        self._goal: Goal | None = None
        self._last_goal_id: int | None = None
        self._ending: _Ending | None = None
        self._under_way = False
        self._replan_asked: int | None = None
        self._relocating: int | None = None
        self._move: Move | None = None
        self.lost = False
        self._obstructed_since: float | None = None
        self._attempts = 0
        self._next_attempt = 0.0

    @property
    def idle(self) -> bool:
        """Whether there is nothing to do and nothing moves."""
        busy = self._goal is not None or self._easing.active or self._relocating is not None
        return not busy and self._body.drive.still

    @property
    def remaining(self) -> float | None:
        """Length of the route still to drive, meters."""
        return None if self.route is None else max(self.route.length - self.track.covered, 0.0)

    # --- commands ---------------------------------------------------------------------------------------------

    def go(self, goal: Goal, now: float) -> None:
        """Take a goal, unless its id was taken before."""
        if self._last_goal_id is not None and goal.id <= self._last_goal_id:
            return
        self._last_goal_id = goal.id
        self._drop_goal()
        self._body.charge.charging = False
        self._move = Move(self._body.wheels.pose, goal.pose) if goal.relative else None
        if reason := self._refusal(goal):
            self.news.append(GoalReport(now, goal.id, GoalStatus.REFUSED, reason))
            return
        self._goal = goal
        self._next_attempt = now
        self.news.append(GoalReport(now, goal.id, GoalStatus.ACCEPTED))

    def halt(self, now: float) -> None:
        """End the goal and any action, and stop."""
        if (easing := self._easing.stop()) is not None:
            self.news.append(ActionReport(now, easing, False, "The robot was halted."))
        self._answer_replan(now, False, "The robot was halted.")
        self.found("The robot was halted.", now)
        if self._goal is not None:
            self._ending = _Ending(GoalStatus.HALTED, "")
            self._end_when_still(now)

    def clear(self, action_id: int, radius: float, now: float) -> None:
        """Forget what is remembered near the robot."""
        self.memory.forget(self.pose, radius)
        self.news.append(ActionReport(now, action_id, True))

    def replan(self, action_id: int, now: float) -> None:
        """Plan anew at the next tick. Without a goal there is nothing to do: the next one is planned anew anyway."""
        if self._goal is None or self._ending is not None:
            self.news.append(ActionReport(now, action_id, True))
            return
        self._answer_replan(now, False, "Another new route was asked for.")
        self._replan_asked = action_id

    def ease_back(self, action_id: int, distance: float, now: float) -> None:
        """Drive backward before anything else."""
        if (replaced := self._easing.stop()) is not None:
            self.news.append(ActionReport(now, replaced, False, "Another drive backward was asked for."))
        self._body.charge.charging = False
        self._easing.begin(action_id, distance)

    def relocate(self, action_id: int, now: float) -> None:
        """Stand until `found` says what came of the look for itself."""
        self.found("Another look was asked for.", now)
        self._relocating = action_id

    def found(self, reason: str, now: float) -> None:
        """The look for itself under way, if there is one, ended: well where no reason is given."""
        if self._relocating is not None:
            self.news.append(ActionReport(now, self._relocating, not reason, reason))
            self._relocating = None

    # --- every tick -------------------------------------------------------------------------------------------

    def think(self, now: float) -> Wish:
        """What speeds the robot wants now. The pose and the memory are up to date."""
        if self._goal is not None and self._body.charge.empty and self._ending is None:
            self._ending = _Ending(GoalStatus.FAILED, "The battery is empty.")
        if self._ending is not None:
            self._end_when_still(now)
            return STAND
        if self._relocating is not None:
            return STAND
        if self._easing.active:
            return self._ease(now)
        if self._goal is None:
            self._answer_replan(now, True, "")
            return STAND
        if self._move is not None:
            return self._go_by_odometry(self._goal, self._move, now)
        return self._pursue(self._goal, now)

    def _answer_replan(self, now: float, done: bool, reason: str) -> None:
        """Answer the new route asked for, if one was."""
        if self._replan_asked is not None:
            self.news.append(ActionReport(now, self._replan_asked, done, reason))
            self._replan_asked = None

    def _ease(self, now: float) -> Wish:
        speed, answer = self._easing.advance(self.memory.field, self.pose)
        if answer is not None:
            self.news.append(ActionReport(now, *answer))
            if self.route is not None:
                self.track.locate(self.route, self.pose)
        return Wish(speed, 0.0)

    def _pursue(self, goal: Goal, now: float) -> Wish:
        if self.lost:
            self._answer_replan(now, False, "The robot does not know where it is.")
            return STAND
        self._supervise(goal, now)
        if self.route is None or self._ending is not None or self.caution.is_blind(self.pose):
            return STAND
        fastest = min(goal.speed, self.caution.fastest(self.route, self.track.covered, self.pose))
        return self._steered(self.memory.field, self.route, self.pose, goal.pose, fastest, now)

    def _go_by_odometry(self, goal: Goal, move: Move, now: float) -> Wish:
        """A relative move: straight, by odometry and what the lidar sees now; a lost robot can make one too."""
        scan, wheels = self.memory.scan, self._body.wheels.pose
        self._answer_replan(now, True, "")
        if scan is None or self.caution.is_blind(self.pose):
            return STAND
        self.route = self._planner.straight(self.memory.field, *move.seen_at(self.pose, wheels))
        if not self._under_way:
            self._begin_route(goal, now)
        self.track.locate(self.route, self.pose)
        field, (start, end) = square_of(scan), move.seen_at(MIDDLE, wheels)
        fastest = min(goal.speed, self.caution.fastest(self.route, self.track.covered, self.pose))
        return self._steered(field, self._planner.straight(field, start, end), MIDDLE, end, fastest, now)

    def _steered(
        self, field: NDArray[np.float32], route: Route, pose: Pose, end: Pose, fastest: float, now: float
    ) -> Wish:
        wish = self._follower.steer(field, route, self.track.covered, pose, end, fastest)
        if wish.arrived:
            self._ending = _Ending(GoalStatus.ARRIVED, "")
            self._end_when_still(now)
        return wish

    def _begin_route(self, goal: Goal, now: float) -> None:
        """There is a new route."""
        self.route_number += 1
        self.track.begin()
        self._follower.begin()
        self._attempts = 0
        self._obstructed_since = None
        if not self._under_way:
            self._under_way = True
            self.news.append(GoalReport(now, goal.id, GoalStatus.UNDER_WAY))

    def _supervise(self, goal: Goal, now: float) -> None:
        """Keep the route fit to be followed: plan where there is none, where it is obstructed, or where asked."""
        if self.route is not None:
            self.track.locate(self.route, self.pose)
        asked = self._replan_asked is not None
        if not asked and not (self._wants_plan(now) and now >= self._next_attempt):
            return
        found = self._attempt(goal, now, anew=asked)
        if asked:
            self._answer_replan(now, found, "" if found else self._why_no_route(goal))

    def _wants_plan(self, now: float) -> bool:
        if self.route is None:
            return True
        if self.route.obstruction(self.memory.field, self.track.covered) is None:
            self._obstructed_since = None
            if self.track.off <= ASTRAY_M:
                self._attempts = 0
            return self.track.off > ASTRAY_M
        if self._obstructed_since is None:
            self._obstructed_since = now
        return now - self._obstructed_since >= PATIENCE_S

    def _attempt(self, goal: Goal, now: float, anew: bool) -> bool:
        """Plan once. Where that fails the old route is kept and followed as far as it goes, unless `anew`."""
        route = self._planner.plan(self._passable(), self.pose, goal.pose)
        self._next_attempt = now + BETWEEN_ATTEMPTS_S
        if route is None:
            self._attempts += 1
            self.route = None if anew else self.route
            if self._attempts >= ATTEMPTS:
                self._ending = _Ending(GoalStatus.NO_ROUTE, self._why_no_route(goal))
            return False
        self.route = route
        self._begin_route(goal, now)
        return True

    # --- ends -------------------------------------------------------------------------------------------------

    def _end_when_still(self, now: float) -> None:
        if self._ending is None or self._goal is None or not self._body.drive.still:
            return
        self.news.append(GoalReport(now, self._goal.id, self._ending.status, self._ending.reason))
        self._answer_replan(now, False, "The goal has ended.")
        self._drop_goal()

    def _drop_goal(self) -> None:
        """Forget the goal and all that belongs to it. A replan under way is for the goal after it."""
        self._goal = None
        self._ending = None
        self._under_way = False
        self.route = None
        self._obstructed_since = None
        self._attempts = 0

    def _refusal(self, goal: Goal) -> str:
        pose = goal.pose
        if self._body.charge.empty:
            return "The battery is empty."
        if goal.relative or self._planner.fits(self.memory.known, pose):
            return ""
        return f"The goal at {pose.x:.2f} m, {pose.y:.2f} m lies in a wall, too near to one, or off the floor."

    def _passable(self) -> NDArray[np.float32]:
        """The distance field to plan on: with what is unseen solid, unless the robot is told to drive there."""
        told = self._body.drive.limits.unseen_space is UnseenSpace.DRIVE_SLOWLY
        return self.memory.field if told else self.memory.without_unseen()

    def _why_no_route(self, goal: Goal) -> str:
        """The reason, from what the robot knows: its map, or what it remembers."""
        if not self._planner.is_joined(self.memory.known, self.pose, goal.pose):
            return "The map has no way to the goal."
        if not self._planner.fits(self.memory.field, goal.pose):
            return "Something that the map does not know stands at the goal."
        if self._planner.is_joined(self.memory.field, self.pose, goal.pose):
            return "Every way to the goal leads through space that the robot has cleared and not seen since."
        return "Something that the map does not know stands in every way to the goal."
