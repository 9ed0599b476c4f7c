"""From the engine's state to the view a screen shows. Looks, and changes nothing."""

from __future__ import annotations

from runner.engine.state import INFINITE, EngineState
from runner.host.view import Health, View
from runner.host.wording import SIGNS
from runner.language.expressions import Kind, Operator, Quantity
from runner.machine.table import Block, Machine, Register, Timer
from runner.machine.wording import say_seconds
from runner.site.values import DAY_S

_RESTS = (Timer.REST, Timer.WAIT, Timer.UP_TO, Timer.LAP)

_WAITS = {"wait until": "waiting for a condition", "charge": "charging", "until the next lap": "until the next lap"}
"""What is said of states in which nothing moves, by their names."""


def clock_text(seconds: float) -> str:
    """Seconds since some midnight as HH:MM:SS."""
    whole = int(seconds) % 86_400
    return f"{whole // 3600:02d}:{whole // 60 % 60:02d}:{whole % 60:02d}"


def view_of(machine: Machine, state: EngineState, stamp: float) -> View:
    """Everything about a run at this stamp."""
    health, reason = _health(machine, state, stamp)
    seen, leg = state.seen, state.leg
    fragment = machine.fragments[machine.blocks[_place_in_machine(state)[0]].fragment]
    limit = state.timers.get(Timer.LEG)
    asked = _asked(machine, state)
    return View(
        stamp=stamp,
        clock=clock_text(state.clock + stamp),
        health=health,
        reason=reason,
        step=None if state.ended else state.step,
        laps=_laps(machine, state),
        laps_at_most=tuple(machine.blocks[loop].times for loop in _loops(machine, state)),
        to_visit=_to_visit(machine, state),
        place=leg.place if leg else None,
        leg_seconds=stamp - leg.began if leg else None,
        leg_limit=limit - leg.began if leg and limit is not None else None,
        tries=state.registers.get(Register.TRIES, 0) if leg else 0,
        tries_at_most=fragment.tries_at_most if leg else 0,
        recoveries=state.registers.get(Register.RECOVERIES, 0) if leg else 0,
        recoveries_at_most=fragment.recoveries_at_most if leg else 0,
        pose=seen.pose if seen else None,
        spread=seen.spread if seen else None,
        speed=seen.speed if seen else 0.0,
        battery=seen.battery if seen else None,
        remaining=seen.remaining if seen else None,
        route=seen.route if seen else (),
        obstacles=seen.obstacles if seen else (),
        legs_arrived=state.legs_arrived,
        legs_failed=state.legs_failed,
        incidents=state.incidents,
        question=asked.text if asked else None,
        answers=asked.answers if asked else (),
        order=machine.orders[state.interrupted.order].name if state.interrupted else None,
        repeats_until=_repeats_until(machine, state, stamp),
        ends_by=None if state.end_by is None else state.end_by - state.clock,
        outcome=state.ended.value if state.ended else None,
    )


def _place_in_machine(state: EngineState) -> tuple[int, int]:
    """Where the mission is; while held, where it was left."""
    return state.held.address if state.held else state.address


def _asked(machine: Machine, state: EngineState) -> Block | None:
    """The block whose question is open, if there is one."""
    block = machine.blocks[state.address[0]]
    return block if block.answers and state.ended is None else None


def _loops(machine: Machine, state: EngineState) -> tuple[int, ...]:
    """The loops around the step that are under way, outermost first."""
    if state.step is None:
        return ()
    return tuple(loop for loop in machine.steps[state.step].loops if loop in state.loops)


def _laps(machine: Machine, state: EngineState) -> tuple[int, ...]:
    return tuple(state.loops[loop].laps for loop in _loops(machine, state))


def _to_visit(machine: Machine, state: EngineState) -> tuple[str, ...]:
    """What the innermost visit under way has still to come to."""
    under_way = [number for number, visit in state.visits.items() if visit.now is not None]
    if not under_way or state.step is None:
        return ()
    number = max(under_way)
    block = machine.blocks[number]
    return tuple(machine.places[block.branch_places[index]].name for index in state.visits[number].left)


def _repeats_until(machine: Machine, state: EngineState, stamp: float) -> float | None:
    """The stamp at which the outermost loop is over: by its time, or as its laps have gone so far."""
    loops = _loops(machine, state)
    if not loops or state.ended is not None:
        return None
    loop, times = state.loops[loops[0]], machine.blocks[loops[0]].times
    by_time = loop.ends - state.clock if loop.ends < INFINITE else _clock_bound(machine, loops[0], loop.entered, state)
    if times is None or loop.laps < 2:
        return by_time
    entered = loop.entered - state.clock
    by_laps = entered + (stamp - entered) / (loop.laps - 1) * times if loop.laps <= times else stamp
    return by_laps if by_time is None else min(by_laps, by_time)


def _clock_bound(machine: Machine, number: int, entered: float, state: EngineState) -> float | None:
    """The stamp of the clock time at which a loop's condition is met at the latest, where it names one."""
    condition = machine.blocks[number].condition
    if condition is None:
        return None
    whole = condition.expression
    for part in (whole, *(whole.parts if whole.kind is Kind.OR else ())):
        if part.quantity is Quantity.CLOCK and part.operator is Operator.AT_LEAST:
            return entered + (part.value - entered) % DAY_S - state.clock
    return None


def _health(machine: Machine, state: EngineState, stamp: float) -> tuple[Health, str]:
    if state.ended is not None:
        return Health.ENDED, state.ended.value
    if state.held is not None:
        return Health.HELD, "a person holds the robot"
    block, local = state.address
    name = machine.fragments[machine.blocks[block].fragment].states[local].name
    rest = _rest(state, stamp)
    if state.incident is not None:
        doing = f", {name}{rest}" if name != "drive" else ", driving on"
        return Health.RECOVERING, SIGNS[state.incident.sign] + doing
    if state.leg is not None and not rest:
        return Health.MOVING, f"on the way to {state.leg.place}"
    return _waiting(machine, state, name, rest)


def _waiting(machine: Machine, state: EngineState, name: str, rest: str) -> tuple[Health, str]:
    if (asked := _asked(machine, state)) is not None:
        return Health.NEEDS_YOU, f"question: {asked.text}{rest}"
    if state.leg is not None:
        return Health.WAITING, name + rest
    if rest or name in _WAITS:
        return Health.WAITING, _WAITS.get(name, "waiting") + rest
    return Health.STARTING, "starting"


def _rest(state: EngineState, stamp: float) -> str:
    """How long a rest or wait still takes, where there is one."""
    deadline = min((state.timers[timer] for timer in _RESTS if timer in state.timers), default=None)
    if deadline is None:
        return ""
    return f", {say_seconds(float(round(max(0.0, deadline - stamp))))} left"
