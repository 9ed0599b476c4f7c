"""The fragments that are not legs: waits, questions, loops, visits, the held region, ends; and what holds anywhere."""

from __future__ import annotations

from runner.machine.table import (
    ALWAYS,
    Action,
    Ending,
    Event,
    Exit,
    Fragment,
    Guard,
    Row,
    State,
    Test,
    Timer,
    Verb,
)

ANYWHERE = (
    Row(Event.HOLD, Exit.HELD, (Action(Verb.HALT),)),
    Row(Event.SKIP, Exit.SKIPPED, (Action(Verb.HALT), Action(Verb.SKIP_LEG))),
    Row(Event.ABORT, Exit.ABORTED, (Action(Verb.HALT),)),
    Row(Event.END_BY_TIME, Exit.TIMED_OUT, (Action(Verb.HALT),)),
)
"""What a person or the end-by time does, whatever state the mission is in. RELEASE means something only while held."""

HELD = Fragment(
    "held",
    (
        State(
            "held",
            (
                Row(Event.RELEASE, Exit.RETURN),
                Row(Event.HOLD, None),
                Row(Event.SKIP, Exit.RETURN_SKIPPED),
            ),
        ),
    ),
)

_UP_TO = Action(Verb.START, timer=Timer.UP_TO)

WAIT = Fragment(
    "wait",
    (State("wait", (Row(Event.WAIT_OVER, Exit.NEXT),), (Action(Verb.START, timer=Timer.WAIT),)),),
)

WAIT_UNTIL = Fragment(
    "wait until",
    (
        State(
            "wait until",
            (
                Row(Event.CONDITION_MET, Exit.NEXT, (Action(Verb.STOP, timer=Timer.UP_TO),)),
                Row(Event.UP_TO_OVER, Exit.FAILED),
            ),
            (_UP_TO,),
            watches=True,
        ),
    ),
)

CHARGE = Fragment(
    "charge",
    (
        State(
            "charge",
            (
                Row(Event.CONDITION_MET, Exit.NEXT, (Action(Verb.HALT), Action(Verb.STOP, timer=Timer.UP_TO))),
                Row(Event.UP_TO_OVER, Exit.FAILED, (Action(Verb.HALT),)),
            ),
            (Action(Verb.CHARGE), _UP_TO),
            watches=True,
        ),
    ),
)

ASK = Fragment(
    "ask",
    (
        State(
            "ask",
            (
                Row(Event.ANSWERED, Exit.NEXT, (Action(Verb.STOP, timer=Timer.UP_TO),)),
                Row(Event.UP_TO_OVER, Exit.NEXT, (Action(Verb.SILENCE),)),
            ),
            (Action(Verb.ASK), _UP_TO),
        ),
    ),
)


def _at_once(name: str, verb: Verb) -> Fragment:
    """A step that takes no time."""
    return Fragment(name, (State(name, (Row(Event.AT_ONCE, Exit.NEXT),), (Action(verb),)),))


COUNT = _at_once("count", Verb.COUNT)
NOTIFY = _at_once("notify", Verb.NOTIFY)

WHEN = Fragment(
    "when",
    (
        State(
            "when",
            (Row(Event.AT_ONCE, Exit.BODY, guard=Guard(Test.CONDITION)), Row(Event.AT_ONCE, Exit.NEXT)),
        ),
    ),
)

VISIT_ENTER, VISIT_NEXT = range(2)
"""Local states of a visit whose order is found out on the way."""

VISIT = Fragment(
    "visit",
    (
        State("enter", (Row(Event.AT_ONCE, VISIT_NEXT),), (Action(Verb.BEGIN_VISIT),)),
        State(
            "next place",
            (Row(Event.AT_ONCE, Exit.BRANCH, guard=Guard(Test.PLACES_LEFT)), Row(Event.AT_ONCE, Exit.NEXT)),
            (Action(Verb.PICK_PLACE),),
        ),
    ),
)

ORDER_CARRY_ON = Fragment("order over, carry on", (State("carry on", (Row(Event.AT_ONCE, Exit.ORDER_RETURN),)),))
ORDER_REPEAT_STEP = Fragment(
    "order over, repeat step", (State("repeat step", (Row(Event.AT_ONCE, Exit.ORDER_REPEAT),)),)
)

# --- loops --------------------------------------------------------------------------------------------------------

LOOP_ENTER, LOOP_HEAD, LOOP_PAUSE, LOOP_DUE = range(4)
"""Local states of a loop: entered once, come back to after each lap; with an interval also where it pauses."""

_LAP = (Action(Verb.COUNT_LAP),)

_GOES_ON: dict[str, tuple[Guard, bool]] = {
    "times": (Guard(Test.LAPS_LEFT), False),
    "for": (Guard(Test.TIME_LEFT), False),
    "until": (Guard(Test.CONDITION), True),
    "for ever": (ALWAYS, False),
}
"""For each bound of a loop the guard looked at before a lap, and whether it says stop (True) or go on (False)."""


def loop_fragment(bound: str, paced: bool) -> Fragment:
    """A loop with that bound; `paced` if its laps begin at an interval.

    The bounds `times` and `for` leave room for one lap, so the first is begun without a look. After a pause the bound
    is looked at again: it may have been passed meanwhile.
    """
    guard, stops = _GOES_ON[bound]
    into_lap = Row(Event.AT_ONCE, Exit.BODY, _LAP)
    looks_again = paced and guard != ALWAYS
    first: int | Exit = Exit.BODY
    if stops:
        first = LOOP_DUE if paced else LOOP_HEAD
    target, lap = (LOOP_DUE, ()) if looks_again else (Exit.BODY, _LAP)
    states = [
        State("enter", (Row(Event.AT_ONCE, first, _LAP if first is Exit.BODY else ()),), (Action(Verb.ENTER_LOOP),)),
        State("next lap", _bounded(guard, stops, Row(Event.AT_ONCE, LOOP_PAUSE) if paced else into_lap)),
    ]
    if paced:
        skipped = (Action(Verb.HALT), Action(Verb.STOP, timer=Timer.LAP), *lap)
        rows = (Row(Event.LAP_DUE, target, lap), Row(Event.SKIP, target, skipped))
        start = Action(Verb.START_LAP, timer=Timer.LAP)
        states.append(State("until the next lap", rows, (start,), resume=LOOP_PAUSE, restart=LOOP_PAUSE))
    if looks_again:
        states.append(State("lap due", _bounded(guard, stops, into_lap)))
    return Fragment(f"repeat, {bound}{', at intervals' if paced else ''}", tuple(states))


def _bounded(guard: Guard, stops: bool, onward: Row) -> tuple[Row, ...]:
    """Rows that leave the loop where its bound says so, and go `onward` otherwise."""
    if guard == ALWAYS:
        return (onward,)
    leave = Row(Event.AT_ONCE, Exit.NEXT, guard=guard if stops else ALWAYS)
    if stops:
        return leave, onward
    return Row(onward.event, onward.target, onward.actions, guard), leave


# --- ends ---------------------------------------------------------------------------------------------------------


def _ending_fragment(ending: Ending) -> Fragment:
    """An end of the mission: halt the robot, say so, and stay."""
    return Fragment(
        f"end, {ending.value}",
        (State(ending.value, (), (Action(Verb.HALT), Action(Verb.END_MISSION, ending=ending))),),
    )


ENDINGS: dict[Ending, Fragment] = {ending: _ending_fragment(ending) for ending in Ending}
