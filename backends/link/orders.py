"""The commands of a controller on their way to the robot: one at a time, sent until answered, a halt before all.

One command is under way at a time, so that a lost one can never be overtaken by a later one. A halt waits for nothing:
it is sent at once and again until it is answered, and everything before it is dropped.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable
from dataclasses import dataclass

from backends.link.messages import Command

AGAIN_S = 0.25
"""Time after which a command that is not answered is sent again."""
HALT_AGAIN_S = 0.1

Making = Callable[[str, int, float], Command]
"""Makes a command of lease, number and the newest stamp heard."""


@dataclass(slots=True)
class Order:
    """A command that is not answered yet. `goal` or `action` says what waits for it."""

    make: Making
    goal: int | None = None
    action: int | None = None
    number: int | None = None
    """Its number; None before it is sent for the first time."""
    next_send: float = 0.0
    again: float = AGAIN_S


class Orders:
    """What is to be sent, in order."""

    def __init__(self) -> None:
        self._waiting: deque[Order] = deque()
        self._halt: Order | None = None
        self._number = 0

    @property
    def first(self) -> Order | None:
        """The order that is under way or next."""
        return self._halt or (self._waiting[0] if self._waiting else None)

    @property
    def halting(self) -> bool:
        """Whether a halt is not answered yet."""
        return self._halt is not None

    def add(self, order: Order) -> None:
        """Send this after all before it."""
        self._waiting.append(order)

    def halt(self, order: Order) -> list[Order]:
        """Send this at once; what it makes void is handed back."""
        void = list(self._waiting)
        self._waiting.clear()
        order.again = HALT_AGAIN_S
        self._halt = order
        return void

    def drop_goals(self) -> None:
        """A new goal replaces those that were not answered yet."""
        self._waiting = deque(order for order in self._waiting if order.goal is None)

    def waits_for(self, goal: int) -> bool:
        """Whether an order for that goal is not answered yet."""
        return any(order.goal == goal for order in self._waiting)

    def waits_for_action(self, action: int) -> bool:
        """Whether an order for that action is not answered yet."""
        return any(order.action == action for order in self._waiting)

    def due(self, lease: str, heard: float, now: float) -> Command | None:
        """The command to send now, if its time has come."""
        order = self.first
        if order is None or now < order.next_send:
            return None
        if order.number is None:
            self._number += 1
            order.number = self._number
        order.next_send = now + order.again
        return order.make(lease, order.number, heard)

    def answered(self, number: int) -> Order | None:
        """Take out the order with that number; None where none waits for it."""
        if self._halt is not None and self._halt.number == number:
            order, self._halt = self._halt, None
            return order
        if self._waiting and self._waiting[0].number == number:
            return self._waiting.popleft()
        return None

    def hurry(self) -> None:
        """Send what is under way again as soon as may be: something that kept it from being served is over."""
        if (order := self.first) is not None:
            order.next_send = 0.0

    def begin_anew(self) -> None:
        """A new lease: its numbers have not been seen there."""
        for order in (*self._waiting, *([self._halt] if self._halt else [])):
            order.number = None
            order.next_send = 0.0
