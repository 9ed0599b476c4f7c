"""Conditions as values: what `until`, `when` and standing orders ask, once it has been read and its types are right.

One small recursive value serves them all, so that it can be part of the machine and of a record.

When a comparison with the clock holds: `clock >= 05:30` becomes true the first time the clock shows 05:30 after the
watch began, and stays so; `clock < 05:30` is its opposite. A watch begins when its loop or wait is entered; for
standing orders and for `when` it began with the mission.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum


class Kind(Enum):
    """What an expression is."""

    AND = "and"
    OR = "or"
    NOT = "not"
    COMPARE = "compare"
    LAST_LEG = "last leg"
    ANSWER = "answer"
    PROVEN = "proven"


class Quantity(Enum):
    """What can be compared, and in which unit its value is kept."""

    BATTERY = "battery"  # fraction, 0 to 1
    CLOCK = "clock"  # seconds since midnight; only < and >=
    ELAPSED = "elapsed"  # seconds since the mission began
    LAPS = "laps"  # laps begun of the innermost loop
    COUNT = "count"  # a count of the mission, by its name


class Operator(Enum):
    """How a quantity is compared."""

    BELOW = "<"
    AT_MOST = "<="
    ABOVE = ">"
    AT_LEAST = ">="
    EQUAL = "="


@dataclass(frozen=True, slots=True)
class Expression:
    """AND and OR have two or more `parts`, NOT has one. COMPARE uses quantity, operator and value; a COUNT its name in
    `word`; LAPS, once compiled, the block of its loop. LAST_LEG has the outcome in `word`, ANSWER the answer.
    """

    kind: Kind
    parts: tuple[Expression, ...] = ()
    quantity: Quantity | None = None
    operator: Operator | None = None
    value: float = 0.0
    word: str = ""
    loop: int | None = None


@dataclass(frozen=True, slots=True)
class Condition:
    """An expression that must have held for `lasting` seconds without a break; `text` is what the author wrote."""

    expression: Expression
    lasting: float = 0.0
    text: str = ""
