"""How long a block that waits for a condition lasts, and what a charge waits for."""

from __future__ import annotations

import math

from runner.language.expressions import Kind, Operator, Quantity
from runner.machine.loop_costs import TICK_S
from runner.machine.spans import INFINITE, Span
from runner.machine.table import WATCH_AFTER_S, Block


def watched(block: Block, until: Span) -> Span:
    """A condition is looked at from WATCH_AFTER_S on, and for `seconds` at most."""
    begun = until.each(lambda time: max(time, WATCH_AFTER_S)).plus(Span(0.0, 0.0, 2.0 * TICK_S))
    bound = INFINITE if block.seconds is None else block.seconds
    likely = begun.likely if math.isfinite(begun.likely) or block.seconds is None else 0.5 * bound
    return Span(min(begun.least, bound), min(likely, bound), min(begun.most, bound + TICK_S))


def charge_level(block: Block) -> float | None:
    """The share of the battery that a charge waits for, where that is all it waits for."""
    expression = block.condition.expression if block.condition else None
    if expression is None or expression.kind is not Kind.COMPARE or expression.quantity is not Quantity.BATTERY:
        return None
    return expression.value if expression.operator in (Operator.AT_LEAST, Operator.ABOVE) else None
