"""Conditions that are watched: that of the state the machine waits in, and those of the standing orders.

They are looked at with every input, and whenever time alone may have changed them: `next_deadline` asks for a Tick
then. A condition has an effect when it has held for its `lasting` without a break. A standing order acts once, and
again only after its condition was false in between; while a person holds the robot or another order acts, it waits.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from runner.engine.conditions import holds, turning_stamps
from runner.engine.draft import Draft
from runner.engine.state import EngineState, Lasting
from runner.language.expressions import Condition
from runner.machine.table import WATCH_AFTER_S, Machine


def look_at_orders(draft: Draft) -> Mapping[int, Lasting]:
    """The registers of the standing orders after a look at each; the same mapping where nothing changed."""
    state, orders = draft.state, draft.machine.orders
    found = dict(state.orders)
    for number, order in enumerate(orders):
        if not holds(draft, order.condition.expression, state.began_clock):
            found.pop(number, None)
        elif number not in found:
            found[number] = Lasting(draft.stamp)
    return found if found != state.orders else state.orders


def next_order(draft: Draft) -> int | None:
    """The first standing order that is to act now."""
    for number, order in enumerate(draft.machine.orders):
        register = draft.state.orders.get(number)
        if register is not None and not register.acted and is_met(draft, order.condition, register):
            return number
    return None


def own_condition(draft: Draft) -> Condition:
    """What the present state waits for."""
    condition = draft.block().condition
    assert condition is not None, "the compiler gives a state that watches its condition"
    return condition


def look_at_own(draft: Draft) -> Lasting | None:
    """The register of the condition the present state waits for, after a look at it; None where it does not hold."""
    state = draft.state
    if not draft.local().watches or draft.stamp < state.entered + WATCH_AFTER_S:
        return None
    if not holds(draft, own_condition(draft).expression, state.since):
        return None
    return state.met or Lasting(draft.stamp)


def is_met(draft: Draft, condition: Condition, register: Lasting) -> bool:
    """Whether a condition has held long enough."""
    return draft.stamp >= register.since + condition.lasting


def next_deadline(machine: Machine, state: EngineState) -> float | None:
    """The stamp at which the engine wants a Tick, if nothing happens before; None if it waits for events alone."""
    if state.ended is not None:
        return None
    deadlines = [*state.timers.values(), *_own_deadlines(machine, state), *_order_deadlines(machine, state)]
    if state.end_by is not None:
        deadlines.append(state.end_by - state.clock)
    return min(deadlines, default=None)


def _own_deadlines(machine: Machine, state: EngineState) -> Iterator[float]:
    block = machine.blocks[state.address[0]]
    if not machine.fragments[block.fragment].states[state.address[1]].watches or block.condition is None:
        return
    looked_from = state.entered + WATCH_AFTER_S
    if state.now < looked_from:
        yield looked_from
    elif state.met is not None:
        yield state.met.since + block.condition.lasting
    turns = turning_stamps(state, block.condition.expression, state.since)
    yield from (stamp for stamp in turns if stamp > max(state.now, looked_from))


def _order_deadlines(machine: Machine, state: EngineState) -> Iterator[float]:
    for number, order in enumerate(machine.orders):
        register = state.orders.get(number)
        if register is not None and not register.acted:
            due = register.since + order.condition.lasting
            if due > state.now:
                yield due
        turns = turning_stamps(state, order.condition.expression, state.began_clock)
        yield from (stamp for stamp in turns if stamp > state.now)
