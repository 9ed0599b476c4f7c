"""Legs as generators: driving, recoveries, rests, tries."""

from __future__ import annotations

from collections.abc import Generator
from dataclasses import dataclass

from runner.engine.values import (
    ActionNews,
    Clear,
    EaseBack,
    Effect,
    Go,
    GoalNews,
    Halt,
    IncidentBegan,
    IncidentEnded,
    LegBegan,
    LegEnded,
    RecoveryBegan,
    Relocate,
    Replan,
    Seen,
    TryFailed,
)
from runner.language.mission import Mark, Mission, Recovery, RecoveryKind, RetryRule
from runner.machine.table import Event, Outcome, Timer
from runner.site.values import Place
from tests.engine.second_interpreter.asking import World
from tests.engine.second_interpreter.courses import (
    Course,
    Leg,
    LegArrived,
    LegTimeOver,
    MissionEnds,
    SkipStep,
    StepAnew,
    Told,
    Walk,
    Word,
)
from tests.engine.second_interpreter.headway import Headway

ACTION_S = 60.0
"""After so long the robot is no longer expected to end a recovery."""


@dataclass(frozen=True)
class Drive:
    """What a leg is to do."""

    mark: Mark
    place: Place
    relative: bool
    rule: RetryRule
    within: float | None


class Driver:
    """What the robot was told and told us: the goal and the recovery under way, and where it stands."""

    def __init__(self, mission: Mission, world: World, effects: list[Effect]) -> None:
        self.world, self.effects = world, effects
        self.speed = min(mission.limits.speed or mission.robot.speed, mission.robot.speed)
        self.at: Place | None = mission.start
        """The place the last leg arrived at, None if it did not."""
        self.seen: Seen | None = None
        self.goal: int | None = None
        self.action: int | None = None
        self.goals = self.actions = self.legs = self.incidents = 0

    @property
    def driven(self) -> float:
        return self.seen.driven if self.seen else 0.0

    def halt(self) -> None:
        self.goal = self.action = None
        self.effects.append(Halt())

    # --- a leg ----------------------------------------------------------------------------------------------------

    def leg(self, drive: Drive, course: Course) -> Generator[None, Told, Outcome]:
        """One leg, to its end; how it ended."""
        self.legs += 1
        leg = Leg(self.legs, drive.place, drive.relative, drive.rule, self.world.now, self.driven)
        self.effects.append(LegBegan(leg.number, 0, leg.place.name))
        within = None if drive.within is None else self.world.now + drive.within
        give_up = None if drive.rule.give_up_after is None else self.world.now + drive.rule.give_up_after
        try:
            with course.timed(Timer.LEG, within), course.timed(Timer.GIVE_UP, give_up):
                yield from self._tries(leg, course)
            outcome = Outcome.FAILED
        except LegArrived:
            outcome = Outcome.ARRIVED
        except LegTimeOver:
            self.halt()
            outcome = Outcome.FAILED
        except SkipStep:
            outcome = Outcome.SKIPPED
        except StepAnew:
            self._ended(leg, Outcome.INTERRUPTED)
            raise
        except MissionEnds:
            self._ended(leg, Outcome.ABORTED)
            raise
        self._ended(leg, outcome)
        return outcome

    def _ended(self, leg: Leg, outcome: Outcome) -> None:
        self._incident_over(leg, outcome is Outcome.ARRIVED)
        self.action = None
        arrived = outcome is Outcome.ARRIVED
        self.at = leg.place if arrived and not leg.relative else None
        self.world.arrived += arrived
        self.world.failed += outcome is Outcome.FAILED
        if outcome in (Outcome.ARRIVED, Outcome.FAILED, Outcome.SKIPPED):
            self.world.last_leg = outcome
        seconds, meters = self.world.now - leg.began, self.driven - leg.driven
        self.effects.append(LegEnded(leg.number, 0, leg.place.name, outcome, "", seconds, meters, leg.tries, leg.begun))

    def _tries(self, leg: Leg, course: Course) -> Walk:
        """Returns when the last try is over; arriving and all else interrupts it."""
        rule = leg.rule
        while True:
            leg.used = 0
            yield from self._try(leg, course)
            self.halt()
            # The language knows no rule without recoveries; the random missions do, and then tries alone count.
            if leg.tries == rule.tries or 0 < rule.tries * len(rule.recover) <= leg.begun:
                return
            seconds = min(rule.rest.first * rule.rest.factor ** (leg.tries - 1), rule.rest.most)
            self.effects.append(TryFailed(leg.number, leg.tries, seconds))
            yield from self._rest(seconds, course)
            leg.tries += 1

    def _try(self, leg: Leg, course: Course) -> Walk:
        gets_on = True
        while gets_on:
            sign = yield from self._drive(leg)
            self._incident(leg, sign)
            gets_on = yield from self._recover(leg, course)

    def _drive(self, leg: Leg) -> Generator[None, Told, Event]:
        """Until there is trouble: its sign."""
        told: Told = Word.ON
        while True:
            match told:
                case Word.ON:
                    self._send(leg)
                    headway = Headway(leg.rule, self.world.now)
                case GoalNews(event=Event.ARRIVED):
                    raise LegArrived
                case GoalNews(event=event) if event is not None:
                    return event
                case Seen():
                    news = headway.report(told)
                    if news is Event.PROGRESSED:
                        leg.used = 0
                        self._incident_over(leg, True)
                    elif news is not None:
                        return news
            told = yield

    def _send(self, leg: Leg) -> None:
        if self.goal is None:
            self.goals += 1
            self.goal = self.goals
            self.effects.append(Go(self.goal, leg.place.name, leg.place.pose, self.speed, leg.relative))

    # --- trouble --------------------------------------------------------------------------------------------------

    def _incident(self, leg: Leg, sign: Event) -> None:
        if leg.incident is not None:
            return
        self.incidents += 1
        leg.incident, leg.incident_began, leg.attempts = self.incidents, self.world.now, 0
        pose, remaining = (self.seen.pose, self.seen.remaining) if self.seen else (None, None)
        self.effects.append(IncidentBegan(leg.incident, leg.number, sign, "", pose, remaining))

    def _incident_over(self, leg: Leg, recovered: bool) -> None:
        if leg.incident is None:
            return
        seconds = self.world.now - leg.incident_began
        self.effects.append(IncidentEnded(leg.incident, leg.number, recovered, "", seconds, "", ()))
        leg.incident = None

    def _recover(self, leg: Leg, course: Course) -> Generator[None, Told, bool]:
        """The next recoveries of the rule until the leg may drive again; False if the try is over."""
        recover = leg.rule.recover
        while leg.used < len(recover) and leg.begun < leg.rule.tries * len(recover):
            recovery = recover[leg.used]
            leg.used += 1
            leg.begun += 1
            leg.attempts += 1
            assert leg.incident is not None
            self.effects.append(
                RecoveryBegan(leg.incident, leg.number, recovery.kind.value, leg.used, leg.attempts, leg.tries)
            )
            if (yield from self._recovery(recovery, course)):
                return True
        return False

    def _recovery(self, recovery: Recovery, course: Course) -> Generator[None, Told, bool]:
        """Whether the leg drives again after it."""
        if recovery.kind is RecoveryKind.REST:
            self.halt()
            with course.timed(Timer.REST, self.world.now + recovery.amount):
                while (yield) not in (Timer.REST, Word.ON):
                    pass
            return True
        self._command(recovery)
        with course.timed(Timer.ACTION, self.world.now + ACTION_S):
            while True:
                match (yield):
                    case Timer.ACTION:
                        self.halt()
                        return False
                    case ActionNews(done=done):
                        return done
                    case GoalNews(event=Event.ARRIVED):
                        raise LegArrived
                    case Word.ON:
                        return True

    def _command(self, recovery: Recovery) -> None:
        self.actions += 1
        self.action = self.actions
        match recovery.kind:
            case RecoveryKind.REPLAN:
                self.effects.append(Replan(self.action))
            case RecoveryKind.CLEAR:
                self.effects.append(Clear(self.action, recovery.amount))
            case RecoveryKind.EASE_BACK:
                self.effects.append(EaseBack(self.action, recovery.amount))
            case _:
                self.effects.append(Relocate(self.action))

    def _rest(self, seconds: float, course: Course) -> Walk:
        with course.timed(Timer.REST, self.world.now + seconds):
            while (yield) is not Timer.REST:
                pass
