"""What is kept of a course of steps, the mission's own or a standing order's, and what interrupts it."""

from __future__ import annotations

from collections.abc import Generator, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from enum import Enum

from runner.engine.values import ActionNews, GoalNews, Seen
from runner.language.mission import Ask, RetryRule, StandingOrder
from runner.machine.table import Ending, Timer
from runner.site.values import Place
from tests.engine.second_interpreter.asking import Watched


class Word(Enum):
    """What a generator that stands can be told, besides reports and timers."""

    MET = "the condition is met"
    ANSWERED = "answered"
    ON = "go on after a hold or an order"


Told = Seen | GoalNews | ActionNews | Timer | Word
Walk = Generator[None, Told, None]


class SkipStep(Exception):  # noqa: N818 - no error, but news
    """A person skips the present step."""


class StepAnew(Exception):  # noqa: N818 - no error, but news
    """The present step begins anew."""


class LegTimeOver(Exception):  # noqa: N818 - no error, but news
    """`within` or `give up after` ran out."""


class LegArrived(Exception):  # noqa: N818 - no error, but news
    """The robot is there."""


class MissionEnds(Exception):  # noqa: N818 - no error, but news
    def __init__(self, ending: Ending, reason: str = "") -> None:
        super().__init__(ending)
        self.ending, self.reason = ending, reason


@dataclass
class Leg:
    number: int
    place: Place
    relative: bool
    rule: RetryRule
    began: float
    driven: float
    tries: int = 1
    used: int = 0
    """How many recoveries of the rule were used since progress or since the try began."""
    begun: int = 0
    """How many recoveries were begun in this leg."""
    incident: int | None = None
    incident_began: float = 0.0
    attempts: int = 0


@dataclass
class Course:
    """`timers` hold deadlines, or, while `frozen`, what is left of each."""

    order: StandingOrder | None = None
    walk: Walk = field(init=False)
    timers: dict[Timer, float] = field(default_factory=dict)
    frozen: bool = False
    watched: Watched | None = None
    question: Ask | None = None

    def freeze(self, now: float) -> None:
        self.timers = {timer: deadline - now for timer, deadline in self.timers.items()}
        self.frozen = True

    def thaw(self, now: float) -> None:
        self.timers = {timer: now + left for timer, left in self.timers.items()}
        self.frozen = False

    @contextmanager
    def timed(self, timer: Timer, deadline: float | None) -> Iterator[None]:
        """A timer that runs while the steps inside go on; None for no timer."""
        if deadline is not None:
            self.timers[timer] = deadline
        try:
            yield
        finally:
            self.timers.pop(timer, None)
