"""The engine: (machine, state, input) -> (state, effects). Pure: no clock, no file, no random number.

It interprets the table of `runner.machine.table` and adds only what a table cannot hold: whether news is about the
goal under way, which timers have run out, and whether progress is enough (`runner.engine.progress`). The same inputs
give the same effects, to the letter.

Order within one input: timers that ran out by its stamp come first, in the order of their deadlines; then the input.
Once the mission has ended, nothing has any effect.
"""

from __future__ import annotations

from collections.abc import Callable
from copy import copy
from dataclasses import replace

from runner.engine.actions import act, begin_recovery, begin_step, finish_leg
from runner.engine.conditions import holds
from runner.engine.draft import Draft, EngineError, next_clock, without
from runner.engine.progress import look
from runner.engine.state import EngineState, Frame, Interrupted
from runner.engine.values import (
    ActionNews,
    Answer,
    Answered,
    Begin,
    ClockMoved,
    ClockSet,
    Effect,
    GoalNews,
    Input,
    Operator,
    OperatorActed,
    OrderBegan,
    OrderEnded,
    PickedUp,
    Remark,
    Remarked,
    Resumed,
    Seen,
    Tick,
    Trouble,
    TroubleNoted,
)
from runner.engine.watching import is_met, look_at_orders, look_at_own, next_order, own_condition
from runner.machine.table import (
    TIMER_EVENTS,
    Action,
    Address,
    Event,
    Exit,
    Guard,
    Machine,
    Outcome,
    Row,
    Test,
    Timer,
    Verb,
)

ROWS_AT_ONCE_MOST = 10_000
"""More rows in a row without time passing is a fault of the machine that the static checks should have found."""


def advance(machine: Machine, state: EngineState, given: Input) -> tuple[EngineState, list[Effect]]:
    """One input in, the next state and what follows from it out. `state` itself is not changed."""
    if state.ended is not None:
        return state, []
    draft = Draft(machine, copy(state), given.stamp)
    _run_timers(draft, given.stamp)
    draft.stamp = given.stamp
    draft.state.now = given.stamp
    if draft.state.ended is None:
        _take_in(draft, given)
    for _ in range(len(machine.orders) + 1):
        if not _look_at_conditions(draft):
            break
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
        case Answer():
            _answer(draft, given)
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
            draft.stamp = max(end_by, draft.state.now)  # the clock may have been set past it
            draft.state.end_by = None
            _happen(draft, Event.END_BY_TIME)
        elif due:
            draft.stamp, _, timer = min(due)
            draft.state.timers = without(draft.state.timers, timer)
            _happen(draft, TIMER_EVENTS[timer])
        else:
            return


def _begin(draft: Draft, given: Begin) -> None:
    draft.state.clock, draft.state.seed = given.clock, given.seed
    draft.state.began, draft.state.began_clock = given.stamp, draft.clock()
    if draft.machine.end_by is not None:
        draft.state.end_by = next_clock(draft.machine.end_by, draft.clock())
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


def _answer(draft: Draft, given: Answer) -> None:
    """An answer counts while its question is open, in whatever case it is written."""
    word = next((word for word in draft.block().answers if word.casefold() == given.word.casefold()), None)
    if word is None or _row(draft, Event.ANSWERED) is None:
        draft.effects.append(OperatorActed(f"answer {given.word}", given.who, False))
        return
    draft.state.answer = word
    draft.effects.append(Answered(word, given.who))
    _happen(draft, Event.ANSWERED)


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
        _enter(draft, _resolve(draft, row.target), resumed=row.target is Exit.RETURN)


def _enter(draft: Draft, address: Address, *, resumed: bool = False) -> None:
    """Enter a state, and go on through rows that are taken at once until a state waits.

    `resumed`: the step had begun before, so it is not noted again.
    """
    for _ in range(ROWS_AT_ONCE_MOST):
        _arrive(draft, address, noted=resumed)
        resumed = False
        row = _row(draft, Event.AT_ONCE)
        if row is None:
            return
        for action in row.actions:
            act(draft, action, Event.AT_ONCE, "")
        if row.target is None:
            raise EngineError(f"the at-once row of {address} leads nowhere")
        resumed = row.target is Exit.ORDER_RETURN
        address = _resolve(draft, row.target)
    raise EngineError(f"no time passes on the way to {address}")


def _arrive(draft: Draft, address: Address, *, noted: bool) -> None:
    draft.state.address = address
    draft.state.entered = draft.stamp
    if not noted:
        draft.state.since = draft.clock()
    draft.state.progress = None
    draft.state.met = None
    step = draft.block().step
    if address[1] == 0 and step is not None and not noted:
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
    if target in _RETURNS:
        return _RETURNS[target](draft)
    if target is Exit.BRANCH:
        return _branch(draft)
    for exit_, address in (*draft.block().exits, *draft.machine.exits):
        if exit_ is target:
            return address
    raise EngineError(f"block {draft.state.address[0]} has no exit '{target.value}'")


def _branch(draft: Draft) -> Address:
    now = draft.state.visits[draft.state.address[0]].now
    if now is None:
        raise EngineError("a visit leads on without a place picked")
    return draft.block().branches[now]


def _holds(draft: Draft, guard: Guard) -> bool:
    if guard.register is not None:
        value = draft.state.registers.get(guard.register, 0)
        return value == guard.amount if guard.test is Test.EQUALS else value < guard.amount
    return _TESTS[guard.test](draft)


def _condition_holds(draft: Draft) -> bool:
    """A loop's condition is watched from when it was entered, that of a `when` from the beginning of the mission."""
    block, loop = draft.block(), draft.state.loops.get(draft.state.address[0])
    assert block.condition is not None, "the compiler gives the block its condition"
    return holds(draft, block.condition.expression, loop.entered if loop else draft.state.began_clock)


_TESTS: dict[Test, Callable[[Draft], bool]] = {
    Test.ALWAYS: lambda _: True,
    Test.LAPS_LEFT: lambda draft: draft.state.loops[draft.state.address[0]].laps < (draft.block().times or 0),
    Test.TIME_LEFT: lambda draft: draft.clock() < draft.state.loops[draft.state.address[0]].ends,
    Test.PLACES_LEFT: lambda draft: draft.state.visits[draft.state.address[0]].now is not None,
    Test.CONDITION: _condition_holds,
}

# --- conditions that are watched ----------------------------------------------------------------------------------


def _look_at_conditions(draft: Draft) -> bool:
    """Let the first standing order act that can, or else the condition the present state waits for; whether one did."""
    state = draft.state
    if state.ended is not None:
        return False
    state.orders = look_at_orders(draft)
    if state.held is None:
        number = next_order(draft) if state.interrupted is None else None
        if number is not None:
            _interrupt(draft, number)
            return True
        state.met = look_at_own(draft)
        if state.met is not None and is_met(draft, own_condition(draft), state.met):
            _happen(draft, Event.CONDITION_MET)
            return True
    return False


def _interrupt(draft: Draft, number: int) -> None:
    """Leave the mission for a standing order: the robot halts, and all that belongs to the leg is kept."""
    state, order = draft.state, draft.machine.orders[number]
    state.orders = {**state.orders, number: replace(state.orders[number], acted=True)}
    draft.effects.append(OrderBegan(order.name, state.step))
    act(draft, Action(Verb.HALT), Event.AT_ONCE, "")
    frame = Frame(state.address, _time_left(draft), state.since)
    state.interrupted = Interrupted(number, frame, state.step, state.registers, state.leg, state.incident)
    state.timers, state.registers, state.leg, state.incident = {}, {}, None, None
    _enter(draft, order.entry)


# --- interruptions ------------------------------------------------------------------------------------------------


def _keep_place(draft: Draft) -> None:
    """Fill the return register of a hold; the timers of what was left stand still meanwhile."""
    draft.state.held = Frame(draft.state.address, _time_left(draft), draft.state.since)
    draft.state.timers = {}


def _time_left(draft: Draft) -> dict[Timer, float]:
    return {timer: deadline - draft.stamp for timer, deadline in draft.state.timers.items()}


def _resumed(draft: Draft, frame: Frame) -> Address:
    """Where a place that was left goes on. Only the leg's own timers outlive a state that is not resumed itself."""
    draft.state.address, draft.state.since = frame.address, frame.since
    resume = draft.local().resume
    same = resume == frame.address[1]
    kept = (timer for timer in frame.timers if same or timer in (Timer.LEG, Timer.GIVE_UP))
    draft.state.timers = {timer: draft.stamp + frame.timers[timer] for timer in kept}
    return frame.address[0], resume


def _release(draft: Draft) -> Address:
    return _resumed(draft, _empty_held(draft))


def _release_skipped(draft: Draft) -> Address:
    """Leave what was held as its own row for SKIP would."""
    draft.state.address = _empty_held(draft).address
    row = _row(draft, Event.SKIP)
    if row is None or row.target is None:
        raise EngineError("what was held cannot be skipped")
    for action in row.actions:
        act(draft, action, Event.SKIP, "")
    return _resolve(draft, row.target)


def _empty_held(draft: Draft) -> Frame:
    frame = draft.state.held
    if frame is None:
        raise EngineError("nothing to return to")
    draft.state.held = None
    return frame


def _order_over(draft: Draft) -> Address:
    return _resumed(draft, _empty_interrupted(draft))


def _order_over_anew(draft: Draft) -> Address:
    """Begin the step anew; a leg that was under way has ended without an outcome of its own."""
    frame = _empty_interrupted(draft)
    draft.state.address = frame.address
    finish_leg(draft, Outcome.INTERRUPTED, "a standing order began the step anew")
    return frame.address[0], draft.local().restart


def _empty_interrupted(draft: Draft) -> Frame:
    """Give the mission back what the standing order found."""
    state, kept = draft.state, draft.state.interrupted
    if kept is None:
        raise EngineError("no standing order to return from")
    draft.effects.append(OrderEnded(draft.machine.orders[kept.order].name))
    state.interrupted, state.step = None, kept.step
    state.registers, state.leg, state.incident = kept.registers, kept.leg, kept.incident
    return kept.frame


_RETURNS: dict[Exit, Callable[[Draft], Address]] = {
    Exit.RETURN: _release,
    Exit.RETURN_SKIPPED: _release_skipped,
    Exit.ORDER_RETURN: _order_over,
    Exit.ORDER_REPEAT: _order_over_anew,
}
