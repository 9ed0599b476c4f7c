"""What a loop takes, from what a lap takes: its bound, its interval, and what a lap that overruns does."""

from __future__ import annotations

import math
from dataclasses import replace

from runner.machine.condition_times import Moment, until_true
from runner.machine.spans import INFINITE, Cost, Span, exactly, product
from runner.machine.table import Block

TICK_S = 1.0
"""A bound is looked at between laps, and time goes on in small steps: what that may add to a lap."""


def loop_cost(block: Block, number: int, lap: Cost, moment: Moment, idle: float) -> Cost:
    """All laps of a loop, entered at a moment. `idle` is the draw of a robot that stands, watts."""
    period = _period(block, lap.seconds)
    laps = _laps(block, period, replace(moment, loop=number, lap=period))
    if block.times is not None:
        rounds = laps.each(lambda count: max(0.0, count - 1.0))
        seconds = period.times(rounds).plus(lap.seconds)
    else:
        seconds = _seconds(block, period, lap.seconds, replace(moment, loop=number, lap=period))
    drawn = lap.energy.times(laps)
    standing = max(0.0, _difference(seconds.likely, product(laps.likely, lap.seconds.likely)))
    energy = Span(
        drawn.least,
        drawn.likely + product(standing, idle) / 3600.0,
        drawn.most + product(seconds.most, idle) / 3600.0,
    )
    return Cost(seconds, lap.meters.times(laps), energy)


def _difference(one: float, other: float) -> float:
    return 0.0 if math.isinf(one) or math.isinf(other) else one - other


def _period(block: Block, lap: Span) -> Span:
    """From the beginning of one lap to that of the next."""
    every = block.every
    if every is None:
        return Span(lap.least, lap.likely, lap.most + TICK_S)
    if not block.wait_for_interval:
        return lap.each(lambda seconds: max(seconds, every)).plus(Span(0.0, 0.0, TICK_S))
    return lap.each(lambda seconds: max(1.0, _ceil(seconds / every)) * every).plus(Span(0.0, 0.0, TICK_S))


def _ceil(value: float) -> float:
    return value if math.isinf(value) else float(math.ceil(value - 1e-9))


def _bound(block: Block, moment: Moment) -> Span:
    """Seconds until the loop's bound is passed."""
    if block.seconds is not None:
        return exactly(block.seconds)
    return exactly(INFINITE) if block.condition is None else until_true(block.condition, moment)


def _laps(block: Block, period: Span, moment: Moment) -> Span:
    if block.times is not None:
        return exactly(float(block.times))
    bound = _bound(block, moment)
    least = _ceil(_quotient(bound.least, period.most))
    return Span(
        max(least, 1.0) if block.seconds is not None else least,
        max(_ceil(_quotient(bound.likely, period.likely)), 1.0),
        _ceil(_quotient(bound.most, period.least)) + 1.0,
    )


def _quotient(time: float, period: float) -> float:
    if math.isinf(period):
        return 0.0
    return INFINITE if period <= 0.0 and time > 0.0 else (0.0 if period <= 0.0 else time / period)


def _seconds(block: Block, period: Span, lap: Span, moment: Moment) -> Span:
    """A loop goes on until its bound is passed, and then to the end of the lap."""
    bound = _bound(block, moment)
    whole = product(max(_ceil(_quotient(bound.likely, period.likely)), 1.0), period.likely)
    least = max(bound.least, lap.least) if block.seconds is not None else bound.least
    return Span(least, max(whole, least), max(bound.most + period.most, least))
