"""Drives an engine by hand: feeds inputs, keeps the effects, answers as a robot would when asked to."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TypeVar

from runner.engine.advance import advance
from runner.engine.state import EngineState, initial_state
from runner.engine.values import ActionNews, Begin, Effect, GoalNews, Input, Operator, Seen, Tick
from runner.engine.watching import next_deadline
from runner.language.mission import Step
from runner.machine.compiler import compile_mission
from runner.machine.table import Event, Machine
from runner.site.values import Point, Pose
from tests.builders import mission

Kind = TypeVar("Kind", bound=Effect)


@dataclass
class Driver:
    """The clock is `now`; `clock` is the time of day at stamp 0, in seconds since midnight."""

    machine: Machine
    clock: float = 18 * 3600.0
    now: float = 0.0
    state: EngineState = field(init=False)
    effects: list[Effect] = field(default_factory=list)
    driven: float = 0.0

    def __post_init__(self) -> None:
        self.state = initial_state(self.machine)
        self.give(Begin(0.0, self.clock))

    def give(self, given: Input) -> list[Effect]:
        self.state, new = advance(self.machine, self.state, given)
        self.effects += new
        return new

    def goal(self, event: Event, reason: str = "") -> list[Effect]:
        """The robot says this of the goal under way."""
        return self.give(GoalNews(self.now, self.state.goal or 0, event, reason))

    def action(self, done: bool = True) -> list[Effect]:
        """The robot ends the action under way."""
        return self.give(ActionNews(self.now, self.state.action or 0, done))

    def person(self, event: Event) -> list[Effect]:
        return self.give(Operator(self.now, event, "nightwatch"))

    def see(
        self, remaining: float | None, after: float = 0.25, route: int = 1, obstacles: tuple[Point, ...] = ()
    ) -> list[Effect]:
        """Telemetry `after` seconds from now."""
        self.now += after
        seen = Seen(self.now, Pose(1.0, 1.0, 0.0), 0.02, 0.5, 0.9, self.driven, remaining, route, (), obstacles)
        return self.give(seen)

    def stand(self, seconds: float, remaining: float | None, obstacles: tuple[Point, ...] = ()) -> list[Effect]:
        """Telemetry four times a second of a robot that does not get on."""
        return [effect for _ in range(int(seconds * 4)) for effect in self.see(remaining, obstacles=obstacles)]

    def pass_time(self, seconds: float) -> list[Effect]:
        """Let time pass, with a tick at each deadline, as the host does."""
        end, new = self.now + seconds, []
        while (deadline := next_deadline(self.machine, self.state)) is not None and deadline <= end:
            self.now = max(self.now, deadline)
            new += self.give(Tick(self.now))
        self.now = end
        return new

    def all(self, kind: type[Kind]) -> list[Kind]:
        """All effects of that kind so far."""
        return [effect for effect in self.effects if isinstance(effect, kind)]

    @property
    def at(self) -> str:
        """The name of the state the machine is in."""
        block, local = self.state.address
        return self.machine.fragments[self.machine.blocks[block].fragment].states[local].name


def start(*steps: Step, end_by: float | None = None) -> Driver:
    """An engine that has begun a mission of these steps."""
    return Driver(compile_mission(mission(*steps, end_by=end_by)))
