"""The engine: (machine, state, input) -> (state, effects). Pure: no clock, no file, no random number.

It interprets the table of `runner.machine.table` and adds only what a table cannot hold: whether news is about the
goal under way, which timers have run out, and whether progress is enough (`runner.engine.progress`). The same inputs
give the same effects, to the letter.

Order within one input: timers that ran out by its stamp come first, in the order of their deadlines; then the input.
Once the mission has ended, nothing has any effect.
"""

from __future__ import annotations

from copy import copy
from dataclasses import replace

from runner.engine.actions import act, begin_recovery, begin_step
from runner.engine.draft import Draft, EngineError, next_clock, without
from runner.engine.progress import look
from runner.engine.state import EngineState, Frame, Loop
from runner.engine.values import (
    ActionNews,
    Begin,
    ClockMoved,
    ClockSet,
    Effect,
    GoalNews,
    Input,
    Operator,
    OperatorActed,
    PickedUp,
    Remark,
    Remarked,
    Resumed,
    Seen,
    Tick,
    Trouble,
    TroubleNoted,
)
from runner.machine.table import TIMER_EVENTS, Address, Event, Exit, Guard, Machine, Row, Test, Timer

ROWS_AT_ONCE_MOST = 10_000
"""More rows in a row without time passing is a fault of the machine that the static checks should have found."""


def advance(machine: Machine, state: EngineState, given: Input) -> tuple[EngineState, list[Effect]]:
    """One input in, the next state and what follows from it out. `state` itself is not changed."""
    if state.ended is not None:
        return state, []
    draft = Draft(machine, copy(state), given.stamp)
    _run_timers(draft, given.stamp)
    draft.stamp = given.stamp
    if draft.state.ended is None:
        _take_in(draft, given)
    return draft.state, draft.effects


# --- inputs -------------------------------------------------------------------------------------------------------


def _take_in(draft: Draft, given: Input) -> None:
    match given:
        case Seen():
            _seen(draft, given)
        case GoalNews():
            _goal_news(draft, given)
        case ActionNews():
            _action_news(draft, given)
        case Operator():
            _operator(draft, given)
        case Begin():
            _begin(draft, given)
        case Tick():
            pass
        case Remark():
            draft.effects.append(Remarked(given.who, given.text))
        case Trouble():
            _trouble(draft, given)
        case ClockMoved():
            _move_clock(draft, given.seconds)
            draft.effects.append(ClockSet(given.seconds))
        case PickedUp():
            _move_clock(draft, given.clock - draft.state.clock)
            draft.effects.append(Resumed(given.who, given.down))


def _run_timers(draft: Draft, stamp: float) -> None:
    """Fire what ran out by `stamp`, earliest first; a timer started meanwhile may run out too."""
    while draft.state.ended is None:
        due = [(deadline, timer.value, timer) for timer, deadline in draft.state.timers.items() if deadline <= stamp]
        end_by = None if draft.state.end_by is None else draft.state.end_by - draft.state.clock
        if end_by is not None and end_by <= stamp and all(end_by <= deadline for deadline, _, _ in due):
            draft.stamp = end_by
            draft.state.end_by = None
            _happen(draft, Event.END_BY_TIME)
        elif due:
            draft.stamp, _, timer = min(due)
            draft.state.timers = without(draft.state.timers, timer)
            _happen(draft, TIMER_EVENTS[timer])
        else:
            return


def _begin(draft: Draft, given: Begin) -> None:
    draft.state.clock = given.clock
    if draft.machine.end_by is not None:
        draft.state.end_by = next_clock(draft.machine.end_by, given.clock)
    _enter(draft, draft.machine.start)


def _seen(draft: Draft, seen: Seen) -> None:
    draft.state.seen = seen
    watch = draft.fragment().watch
    if draft.state.progress is None or watch is None or draft.state.goal is None:
        return
    draft.state.progress, event = look(draft.state.progress, watch, seen)
    if event is not None:
        _happen(draft, event)


def _goal_news(draft: Draft, news: GoalNews) -> None:
    if news.goal_id == draft.state.goal and news.event is not None:
        draft.state.goal = None
        _happen(draft, news.event, news.reason)


def _action_news(draft: Draft, news: ActionNews) -> None:
    if news.action_id == draft.state.action:
        draft.state.action = None
        _happen(draft, Event.ACTION_DONE if news.done else Event.ACTION_FAILED, news.reason)


def _operator(draft: Draft, given: Operator) -> None:
    accepted = _row(draft, given.event) is not None
    draft.effects.append(OperatorActed(given.event.value, given.who, accepted))
    _happen(draft, given.event)


def _trouble(draft: Draft, given: Trouble) -> None:
    """Hold the mission as a person would, but in nobody's name."""
    held = draft.state.held is None and _row(draft, Event.HOLD) is not None
    draft.effects.append(TroubleNoted(given.kind, given.detail, held))
    _happen(draft, Event.HOLD)


def _move_clock(draft: Draft, seconds: float) -> None:
    """Move the clock by so much. Deadlines of the clock stay where they are; a loop that was to last a while still
    does."""
    draft.state.clock += seconds
    loops = draft.state.loops
    draft.state.loops = {number: replace(loop, ends=loop.ends + seconds) for number, loop in loops.items()}


# --- the table ----------------------------------------------------------------------------------------------------


def _happen(draft: Draft, event: Event, detail: str = "") -> None:
    """Take the row of this event, if there is one."""
    row = _row(draft, event)
    if row is None:
        return
    if row.target is Exit.HELD:
        _keep_place(draft)
    for action in row.actions:
        act(draft, action, event, detail)
    if row.target is not None:
        _enter(draft, _resolve(draft, row.target))


def _enter(draft: Draft, address: Address) -> None:
    """Enter a state, and go on through rows that are taken at once until a state waits."""
    for _ in range(ROWS_AT_ONCE_MOST):
        _arrive(draft, address)
        row = _row(draft, Event.AT_ONCE)
        if row is None:
            return
        for action in row.actions:
            act(draft, action, Event.AT_ONCE, "")
        if row.target is None:
            raise EngineError(f"the at-once row of {address} leads nowhere")
        address = _resolve(draft, row.target)
    raise EngineError(f"no time passes on the way to {address}")


def _arrive(draft: Draft, address: Address) -> None:
    draft.state.address = address
    draft.state.progress = None
    step = draft.block().step
    if address[1] == 0 and step is not None:
        begin_step(draft, step)
    state = draft.local()
    if state.recovery:
        begin_recovery(draft, state)
    for action in state.on_entry:
        act(draft, action, Event.AT_ONCE, "")


def _row(draft: Draft, event: Event) -> Row | None:
    for row in draft.local().rows:
        if row.event is event and _holds(draft, row.guard):
            return row
    return next((row for row in draft.machine.anywhere if row.event is event), None)


def _resolve(draft: Draft, target: int | Exit) -> Address:
    if isinstance(target, int):
        return draft.state.address[0], target
    if target is Exit.RETURN or target is Exit.RETURN_SKIPPED:
        return _return(draft, target)
    for exit_, address in (*draft.block().exits, *draft.machine.exits):
        if exit_ is target:
            return address
    raise EngineError(f"block {draft.state.address[0]} has no exit '{target.value}'")


def _holds(draft: Draft, guard: Guard) -> bool:
    if guard.test is Test.ALWAYS:
        return True
    if guard.register is not None:
        value = draft.state.registers.get(guard.register, 0)
        return value == guard.amount if guard.test is Test.EQUALS else value < guard.amount
    loop = draft.state.loops.get(draft.state.address[0], Loop())
    if guard.test is Test.LAPS_LEFT:
        return loop.laps < (draft.block().times or 0)
    return draft.stamp + draft.state.clock < loop.ends


# --- interruptions ------------------------------------------------------------------------------------------------


def _keep_place(draft: Draft) -> None:
    """Fill the return register; the timers of what was left stand still meanwhile."""
    left = {timer: deadline - draft.stamp for timer, deadline in draft.state.timers.items()}
    draft.state.held = Frame(draft.state.address, left)
    draft.state.timers = {}


def _return(draft: Draft, how: Exit) -> Address:
    """Empty the return register. Only the leg's own timers outlive a state that is not resumed itself."""
    frame = draft.state.held
    if frame is None:
        raise EngineError("nothing to return to")
    draft.state.held = None
    draft.state.address = frame.address
    if how is Exit.RETURN_SKIPPED:
        return _resolve(draft, Exit.SKIPPED)
    resume = draft.local().resume
    same = resume == frame.address[1]
    kept = (timer for timer in frame.timers if same or timer in (Timer.LEG, Timer.GIVE_UP))
    draft.state.timers = {timer: draft.stamp + frame.timers[timer] for timer in kept}
    return frame.address[0], resume
