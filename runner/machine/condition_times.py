"""When a condition will become true, as far as that can be told beforehand: seconds from a moment on."""

from __future__ import annotations

from dataclasses import dataclass

from runner.language.expressions import Condition, Expression, Kind, Operator, Quantity
from runner.machine.spans import INFINITE, NOTHING, UNKNOWN, Span, exactly, latest, product, soonest
from runner.site.values import DAY_S

AT_LEAST = (Operator.AT_LEAST, Operator.ABOVE)

HOLDS_OR_NOT = Span(0.0, 0.0, INFINITE)
"""It may hold already, or never."""


@dataclass(frozen=True, slots=True)
class Moment:
    """When the watch begins: `since` the run began, seconds; `begins` is the time of day then, seconds since midnight.

    `lap` is what a lap lasts, from one to the next, of loop `loop`; `battery` what share of the battery is left, and
    `drain` the share that is likely to go in a second.
    """

    since: Span
    begins: float
    loop: int | None = None
    lap: Span = UNKNOWN
    battery: float = 1.0
    drain: float = 0.0


def until_true(condition: Condition, moment: Moment) -> Span:
    """Seconds until the condition becomes true; infinite where nothing says that it will."""
    return _until(condition.expression, moment).plus(exactly(condition.lasting))


def _until(expression: Expression, moment: Moment) -> Span:
    match expression.kind:
        case Kind.AND:
            return latest([_until(part, moment) for part in expression.parts])
        case Kind.OR:
            return soonest([_until(part, moment) for part in expression.parts])
        case Kind.COMPARE:
            return _compared(expression, moment)
        case Kind.PROVEN:
            return UNKNOWN
        case _:
            return HOLDS_OR_NOT


def _compared(expression: Expression, moment: Moment) -> Span:
    rising = expression.operator in AT_LEAST
    match expression.quantity:
        case Quantity.CLOCK:
            return until_clock(expression.value, moment) if rising else NOTHING
        case Quantity.ELAPSED:
            return _until_elapsed(expression.value, moment) if rising else HOLDS_OR_NOT
        case Quantity.LAPS if rising and expression.loop == moment.loop:
            return moment.lap.each(lambda lap: product(expression.value, lap))
        case Quantity.COUNT if rising:
            return Span(0.0, product(expression.value, moment.lap.likely), INFINITE)
        case Quantity.BATTERY if not rising:
            return _until_drained(expression.value, moment)
        case _:
            return HOLDS_OR_NOT


def until_clock(clock: float, moment: Moment) -> Span:
    """Seconds until the clock first shows a time, from a moment on that is known within bounds."""
    since = moment.since
    first = _ahead(clock, moment.begins + since.least)
    spread = since.most - since.least
    likely = _ahead(clock, moment.begins + since.likely) if since.likely < INFINITE else first
    if spread >= first:
        return Span(0.0, likely, DAY_S)
    return Span(first - spread, likely, first)


def _ahead(clock: float, now: float) -> float:
    return (clock - now) % DAY_S or DAY_S


def _until_elapsed(seconds: float, moment: Moment) -> Span:
    since = moment.since
    return Span(max(0.0, seconds - since.most), max(0.0, seconds - since.likely), max(0.0, seconds - since.least))


def _until_drained(share: float, moment: Moment) -> Span:
    if moment.drain <= 0.0:
        return UNKNOWN
    return Span(0.0, max(0.0, moment.battery - share) / moment.drain, INFINITE)
