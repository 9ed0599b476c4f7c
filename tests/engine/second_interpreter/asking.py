"""What a condition asks, and whether it holds: the clock, the claim that is to be proven, lasting."""

from __future__ import annotations

import operator
from collections.abc import Callable
from dataclasses import dataclass, field
from math import comb, inf

from runner.language.expressions import Condition, Expression, Kind, Operator, Quantity
from runner.language.mission import Prove
from runner.machine.table import Outcome
from runner.site.values import DAY_S

COMPARED: dict[Operator, Callable[[float, float], bool]] = {
    Operator.BELOW: operator.lt,
    Operator.AT_MOST: operator.le,
    Operator.ABOVE: operator.gt,
    Operator.AT_LEAST: operator.ge,
    Operator.EQUAL: operator.eq,
}

SHORTLY_S = 0.001
"""A comparison such as `elapsed > 60 s` changes just after its moment."""


@dataclass
class Loop:
    """A loop that was entered: when (seconds of the run, and on the wall), its laps, and when this lap began."""

    entered: float
    watch: float
    laps: int = 0
    lap_began: float = 0.0


@dataclass
class World:
    """What conditions ask about. `wall` runs on over midnight: seconds since the midnight before the mission."""

    claim: Prove | None
    now: float = 0.0
    clock: float = 0.0
    battery: float | None = None
    last_leg: Outcome | None = None
    answer: str | None = None
    counts: dict[str, int] = field(default_factory=dict)
    arrived: int = 0
    failed: int = 0

    @property
    def wall(self) -> float:
        return self.clock + self.now

    def holds(self, asked: Expression, watch: float, loop: Loop | None) -> bool:
        """`watch` is the time on the wall at which the watch of the clock began."""
        match asked.kind:
            case Kind.AND | Kind.OR | Kind.NOT:
                parts = [self.holds(part, watch, loop) for part in asked.parts]
                return {Kind.AND: all(parts), Kind.OR: any(parts), Kind.NOT: not parts[0]}[asked.kind]
            case Kind.LAST_LEG:
                return self.last_leg is not None and self.last_leg.value == asked.word
            case Kind.ANSWER:
                return self.answer is not None and self.answer.lower() == asked.word.lower()
            case Kind.PROVEN:
                return self.claim is not None and proven(self.arrived, self.failed, self.claim)
            case Kind.COMPARE:
                return self._compares(asked, watch, loop)

    def _compares(self, asked: Expression, watch: float, loop: Loop | None) -> bool:
        assert asked.operator is not None
        match asked.quantity:
            case Quantity.CLOCK:
                come = self.wall >= shows(asked.value, watch)
                return come if asked.operator is Operator.AT_LEAST else not come
            case Quantity.BATTERY:
                return self.battery is not None and COMPARED[asked.operator](self.battery, asked.value)
            case Quantity.ELAPSED:
                return COMPARED[asked.operator](self.now, asked.value)
            case Quantity.LAPS:
                return loop is not None and COMPARED[asked.operator](loop.laps, asked.value)
            case _:
                return COMPARED[asked.operator](self.counts.get(asked.word, 0), asked.value)


def shows(clock: float, after: float) -> float:
    """The first time on the wall after `after` at which the clock shows this."""
    days = (after - clock) // DAY_S + 1
    return clock + days * DAY_S


def proven(arrived: int, failed: int, claim: Prove) -> bool:
    """The test of LANGUAGE.md; the integral by the binomial sum for the incomplete beta function."""
    share, legs = claim.legs_arrive, arrived + failed
    if legs == 0 or arrived / legs <= share:
        return False
    tail = sum(comb(legs + 1, k) * share**k * (1 - share) ** (legs + 1 - k) for k in range(arrived + 1))
    integral = tail / ((legs + 1) * comb(legs, arrived))
    return integral / ((1 - share) * share**arrived * (1 - share) ** failed) >= 1 / (1 - claim.confidence)


@dataclass
class Watched:
    """A condition that is looked at again and again, from `start` on, and since when it has held without a break."""

    condition: Condition
    watch: float
    loop: Loop | None
    start: float
    since: float | None = None

    def look(self, world: World) -> bool:
        """Whether it holds now, and has held as long as it must."""
        if world.now < self.start:
            return False
        if not world.holds(self.condition.expression, self.watch, self.loop):
            self.since = None
            return False
        if self.since is None:
            self.since = world.now
        return world.now - self.since >= self.condition.lasting

    def next_look(self, world: World) -> float:
        """When time alone may change what is seen; infinity for never."""
        moments = list(self._changes(self.condition.expression, world))
        if self.since is not None:
            moments.append(self.since + self.condition.lasting)
        if world.now < self.start:
            moments = [self.start]
        return min((moment for moment in moments if moment > world.now), default=inf)

    def _changes(self, asked: Expression, world: World) -> list[float]:
        if asked.quantity is Quantity.CLOCK:
            turn = shows(asked.value, self.watch) - world.clock
            return [turn, turn + SHORTLY_S]
        if asked.quantity is Quantity.ELAPSED:
            return [asked.value, asked.value + SHORTLY_S]
        return [moment for part in asked.parts for moment in self._changes(part, world)]
