"""Whether a condition holds, and when it will by time alone. What is not known yet makes a comparison false."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from runner.engine.draft import Draft, next_clock
from runner.engine.proof import proven
from runner.engine.state import EngineState, Loop
from runner.language.expressions import Expression, Kind, Operator, Quantity

MOMENT_S = 0.001

_COMPARE: dict[Operator, Callable[[float, float], bool]] = {
    Operator.BELOW: lambda value, bound: value < bound,
    Operator.AT_MOST: lambda value, bound: value <= bound,
    Operator.ABOVE: lambda value, bound: value > bound,
    Operator.AT_LEAST: lambda value, bound: value >= bound,
    Operator.EQUAL: lambda value, bound: value == bound,
}


def holds(draft: Draft, expression: Expression, since: float) -> bool:
    """Whether it holds now. `since` is the clock, seconds since the midnight before the run, when the watch began."""
    return _KINDS[expression.kind](draft, expression, since)


def _last_leg(draft: Draft, expression: Expression, _: float) -> bool:
    return draft.state.last_leg is not None and draft.state.last_leg.value == expression.word


def _proven(draft: Draft, _: Expression, __: float) -> bool:
    claim, state = draft.machine.prove, draft.state
    return claim is not None and proven(state.legs_arrived, state.legs_failed, claim.legs_arrive, claim.confidence)


def _compares(draft: Draft, expression: Expression, since: float) -> bool:
    assert expression.operator is not None, "the reader gives every comparison its operator"
    if expression.quantity is Quantity.CLOCK:
        reached = draft.clock() >= next_clock(expression.value, since)
        return reached is (expression.operator is Operator.AT_LEAST)
    value = _value(draft, expression)
    return value is not None and _COMPARE[expression.operator](value, expression.value)


def _value(draft: Draft, expression: Expression) -> float | None:
    state = draft.state
    match expression.quantity:
        case Quantity.BATTERY:
            return state.seen.battery if state.seen else None
        case Quantity.ELAPSED:
            return draft.stamp - state.began
        case Quantity.LAPS:
            return None if expression.loop is None else state.loops.get(expression.loop, Loop()).laps
        case _:
            return state.counts.get(expression.word, 0)


_KINDS: dict[Kind, Callable[[Draft, Expression, float], bool]] = {
    Kind.AND: lambda draft, expression, since: all(holds(draft, part, since) for part in expression.parts),
    Kind.OR: lambda draft, expression, since: any(holds(draft, part, since) for part in expression.parts),
    Kind.NOT: lambda draft, expression, since: not holds(draft, expression.parts[0], since),
    Kind.COMPARE: _compares,
    Kind.LAST_LEG: _last_leg,
    Kind.ANSWER: lambda draft, expression, _: draft.state.answer == expression.word,
    Kind.PROVEN: _proven,
}


def turning_stamps(state: EngineState, expression: Expression, since: float) -> Iterator[float]:
    """The stamps at which time alone may change whether it holds, past and to come.

    Each comes twice, the second a moment later: on the stamp itself `>` does not hold yet, and rounding may be
    against us.
    """
    for part in expression.parts:
        yield from turning_stamps(state, part, since)
    turns = None
    if expression.quantity is Quantity.CLOCK:
        turns = next_clock(expression.value, since) - state.clock
    elif expression.quantity is Quantity.ELAPSED:
        turns = state.began + expression.value
    if turns is not None:
        yield from (turns, turns + MOMENT_S)
