"""The ladder of recoveries: how one leg becomes states. This file is where a retry rule's order and bounds are written.

A leg drives; trouble sends it up the ladder, one recovery at a time; progress brings it back to the first rung.

    begin -> drive <-> choose -> recovery 1 ... recovery n
               ^          |
               |       try over -> rest -> drive (next try)
               |          |
            arrived     failed

Bounded thrice, so that no leg goes on for ever:
- per try: without progress each recovery of the rule is tried once, in the order written; then the try is over;
- per leg: at most `tries` tries, and at most tries x recoveries recoveries in all, however often progress
  brought the ladder back to its first rung;
- by time: the rule's `give up after` and the step's `within`.
"""

from __future__ import annotations

from collections.abc import Callable

from runner.language.mission import Recovery, RecoveryKind, RetryRule
from runner.machine.table import (
    GOAL_ENDS,
    Action,
    Event,
    Exit,
    Fragment,
    Guard,
    Outcome,
    Register,
    Row,
    State,
    Test,
    Timer,
    Verb,
    Watch,
)

ACTION_TIME_S = 60.0
"""How long a robot may take over one recovery before the next is tried. Our choice: several times what easing back
half a meter or planning across a floor takes."""

REST_MOST_S = 86_400.0
"""A rest between tries that doubles without a bound of its own ends here."""

BEGIN, DRIVE, CHOOSE, TRY_OVER, REST, FIRST_RECOVERY = range(6)
"""Local states of every leg; recovery i is FIRST_RECOVERY + i."""

TROUBLE = (Event.STALLED, Event.SWAYING, *GOAL_ENDS)


def leg_fragment(rule: RetryRule) -> Fragment:
    """The states of a leg under `rule`, with exits NEXT (arrived), FAILED and SKIPPED."""
    bound = rule.tries * len(rule.recover)
    return Fragment(
        name=f"leg, rule {rule.name}",
        states=(
            _begin(rule),
            _drive(),
            _choose(rule, bound),
            _try_over(rule, bound),
            _rest_between_tries(rule),
            *(_recovery(index, recovery) for index, recovery in enumerate(rule.recover)),
        ),
        watch=Watch(rule.stall_progress, rule.stall_window),
        recoveries_at_most=bound,
        tries_at_most=rule.tries,
    )


def _begin(rule: RetryRule) -> State:
    give_up = (Action(Verb.START, timer=Timer.GIVE_UP, amount=rule.give_up_after),) if rule.give_up_after else ()
    return State(
        "begin",
        on_entry=(
            Action(Verb.BEGIN_LEG),
            Action(Verb.SET, register=Register.TRIES, amount=1),
            Action(Verb.SET, register=Register.RUNG, amount=0),
            Action(Verb.SET, register=Register.RECOVERIES, amount=0),
            Action(Verb.START, timer=Timer.LEG),
            *give_up,
        ),
        rows=(Row(Event.AT_ONCE, DRIVE),),
        resume=DRIVE,
    )


def _drive() -> State:
    return State(
        "drive",
        on_entry=(Action(Verb.DRIVE),),
        rows=(
            _arrived(),
            *(Row(event, CHOOSE, (Action(Verb.OPEN_INCIDENT),)) for event in TROUBLE),
            Row(
                Event.PROGRESSED,
                None,
                (Action(Verb.SET, register=Register.RUNG, amount=0), Action(Verb.CLOSE_INCIDENT)),
            ),
            *_time_bounds(),
        ),
        resume=DRIVE,
    )


def _choose(rule: RetryRule, bound: int) -> State:
    spent = Row(Event.AT_ONCE, TRY_OVER, guard=Guard(Test.EQUALS, Register.RECOVERIES, bound))
    rungs = tuple(
        Row(Event.AT_ONCE, FIRST_RECOVERY + index, guard=Guard(Test.EQUALS, Register.RUNG, index))
        for index in range(len(rule.recover))
    )
    return State("choose", rows=(spent, *rungs, Row(Event.AT_ONCE, TRY_OVER)), resume=DRIVE)


def _try_over(rule: RetryRule, bound: int) -> State:
    tries_spent = "its only try failed" if rule.tries == 1 else f"all {rule.tries} tries failed"
    recoveries_spent = (
        (_failed(Event.AT_ONCE, f"all {bound} recoveries used", Guard(Test.EQUALS, Register.RECOVERIES, bound)),)
        if bound
        else ()
    )
    return State(
        "try over",
        on_entry=(Action(Verb.HALT),),
        rows=(
            _failed(Event.AT_ONCE, tries_spent, Guard(Test.EQUALS, Register.TRIES, rule.tries)),
            *recoveries_spent,
            Row(Event.AT_ONCE, REST),
        ),
        resume=DRIVE,
    )


def _rest_between_tries(rule: RetryRule) -> State:
    rest = (rule.rest.first, rule.rest.factor, min(rule.rest.most, REST_MOST_S))
    next_try = (
        Action(Verb.ADD, register=Register.TRIES, amount=1),
        Action(Verb.SET, register=Register.RUNG, amount=0),
    )
    return State(
        "rest between tries",
        on_entry=(Action(Verb.START_REST, timer=Timer.REST, rest=rest),),
        rows=(Row(Event.REST_OVER, DRIVE, next_try), *_time_bounds()),
        resume=REST,
    )


def _recovery(index: int, recovery: Recovery) -> State:
    """One rung. A goal the robot ends meanwhile is sent anew by `drive`; an arrival is an arrival."""
    begin, rows = _RECOVERIES[recovery.kind](recovery)
    return State(
        recovery_name(recovery),
        on_entry=(
            Action(Verb.ADD, register=Register.RUNG, amount=1),
            Action(Verb.ADD, register=Register.RECOVERIES, amount=1),
            *begin,
        ),
        rows=(
            _arrived(),
            *rows,
            *(Row(event, None) for event in GOAL_ENDS),
            *_time_bounds(),
        ),
        resume=DRIVE,
        recovery=index + 1,
    )


def _asked_of_robot(recovery: Recovery) -> tuple[tuple[Action, ...], tuple[Row, ...]]:
    verb = _VERBS[recovery.kind]
    stop_timer = (Action(Verb.STOP, timer=Timer.ACTION),)
    return (
        (Action(verb, amount=recovery.amount), Action(Verb.START, timer=Timer.ACTION, amount=ACTION_TIME_S)),
        (
            Row(Event.ACTION_DONE, DRIVE, stop_timer),
            Row(Event.ACTION_FAILED, CHOOSE, stop_timer),
            Row(Event.ACTION_OVERDUE, CHOOSE, (Action(Verb.HALT),)),
        ),
    )


def _rested(recovery: Recovery) -> tuple[tuple[Action, ...], tuple[Row, ...]]:
    return (
        (Action(Verb.HALT), Action(Verb.START, timer=Timer.REST, amount=recovery.amount)),
        (Row(Event.REST_OVER, DRIVE),),
    )


_VERBS: dict[RecoveryKind, Verb] = {
    RecoveryKind.CLEAR: Verb.CLEAR,
    RecoveryKind.REPLAN: Verb.REPLAN,
    RecoveryKind.EASE_BACK: Verb.EASE_BACK,
    RecoveryKind.RELOCATE: Verb.RELOCATE,
}

_RECOVERIES: dict[RecoveryKind, Callable[[Recovery], tuple[tuple[Action, ...], tuple[Row, ...]]]] = {
    **dict.fromkeys(_VERBS, _asked_of_robot),
    RecoveryKind.REST: _rested,
}


def _arrived() -> Row:
    return Row(Event.ARRIVED, Exit.NEXT, (Action(Verb.END_LEG, outcome=Outcome.ARRIVED),))


def _failed(event: Event, reason: str, guard: Guard | None = None) -> Row:
    actions = (Action(Verb.HALT), Action(Verb.END_LEG, outcome=Outcome.FAILED, reason=reason))
    return Row(event, Exit.FAILED, actions, guard or Guard(Test.ALWAYS))


def _time_bounds() -> tuple[Row, ...]:
    return (
        _failed(Event.LEG_TIME_OVER, "its time limit was over"),
        _failed(Event.GIVE_UP_TIME, "the rule gave up"),
    )


def recovery_name(recovery: Recovery) -> str:
    """The words an author would write: `clear 3 m`."""
    unit = {RecoveryKind.CLEAR: "m", RecoveryKind.EASE_BACK: "m", RecoveryKind.REST: "s"}.get(recovery.kind)
    return f"{recovery.kind.value} {recovery.amount:g} {unit}" if unit else recovery.kind.value
