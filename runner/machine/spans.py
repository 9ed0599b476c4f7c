"""Numbers known only within bounds: least, likely and most; and sums of them, as interval arithmetic has it."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

INFINITE = math.inf


@dataclass(frozen=True, slots=True)
class Span:
    """`most` may be infinite, where nothing bounds it; so may `likely`."""

    least: float
    likely: float
    most: float

    def plus(self, other: Span) -> Span:
        return Span(self.least + other.least, self.likely + other.likely, self.most + other.most)

    def times(self, count: Span) -> Span:
        return Span(
            product(self.least, count.least), product(self.likely, count.likely), product(self.most, count.most)
        )

    def each(self, function: Callable[[float], float]) -> Span:
        """The span of a function that never falls."""
        return Span(function(self.least), function(self.likely), function(self.most))

    def at_most(self, bound: float) -> Span:
        return self.each(lambda value: min(value, bound))


NOTHING = Span(0.0, 0.0, 0.0)
UNKNOWN = Span(0.0, INFINITE, INFINITE)


def exactly(value: float) -> Span:
    """A number that is known."""
    return Span(value, value, value)


def product(one: float, other: float) -> float:
    """Like `*`, but nothing times infinitely often is nothing."""
    return 0.0 if one == 0.0 or other == 0.0 else one * other


def either(spans: Sequence[Span], shares: Sequence[float]) -> Span:
    """One of several, each likely by its share."""
    whole = sum(shares)
    weights = [share / whole for share in shares] if whole > 0.0 else [1.0 / len(spans)] * len(spans)
    return Span(
        min(span.least for span in spans),
        sum(product(span.likely, weight) for span, weight in zip(spans, weights, strict=True)),
        max(span.most for span in spans),
    )


def latest(spans: Sequence[Span]) -> Span:
    """When all of several have come."""
    return Span(*(max(values) for values in zip(*map(_bounds, spans), strict=True)))


def soonest(spans: Sequence[Span]) -> Span:
    """When the first of several has come."""
    return Span(*(min(values) for values in zip(*map(_bounds, spans), strict=True)))


def _bounds(span: Span) -> tuple[float, float, float]:
    return span.least, span.likely, span.most


@dataclass(frozen=True, slots=True)
class Cost:
    """What a stretch of a mission takes: seconds, meters driven, watt-hours drawn from the battery."""

    seconds: Span = NOTHING
    meters: Span = NOTHING
    energy: Span = NOTHING

    def plus(self, other: Cost) -> Cost:
        return Cost(self.seconds.plus(other.seconds), self.meters.plus(other.meters), self.energy.plus(other.energy))


FREE = Cost()


def summed(costs: Iterable[Cost]) -> Cost:
    """All of them, one after the other."""
    whole = FREE
    for cost in costs:
        whole = whole.plus(cost)
    return whole


def one_of(costs: Sequence[Cost], shares: Sequence[float]) -> Cost:
    """One of several, each likely by its share."""
    return Cost(
        either([cost.seconds for cost in costs], shares),
        either([cost.meters for cost in costs], shares),
        either([cost.energy for cost in costs], shares),
    )
