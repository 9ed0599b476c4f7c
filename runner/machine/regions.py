"""The fragments that are not legs: waits, loops, the held region and the ends; and the rows that hold anywhere."""

from __future__ import annotations

from runner.machine.table import (
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

ENTER, HEAD = range(2)
"""Local states of a loop: entered once, and come back to after each lap."""

ANYWHERE = (
    Row(Event.HOLD, Exit.HELD, (Action(Verb.HALT),)),
    Row(Event.SKIP, Exit.SKIPPED, (Action(Verb.HALT), Action(Verb.SKIP_LEG))),
    Row(Event.ABORT, Exit.ABORTED, (Action(Verb.HALT),)),
    Row(Event.END_BY_TIME, Exit.TIMED_OUT, (Action(Verb.HALT),)),
)
"""What a person or the end-by time does, whatever state the mission is in. RELEASE means something only while held."""

WAIT = Fragment(
    "wait",
    (State("wait", (Row(Event.WAIT_OVER, Exit.NEXT),), (Action(Verb.START, timer=Timer.WAIT),)),),
)

HELD = Fragment(
    "held",
    (
        State(
            "held",
            (
                Row(Event.RELEASE, Exit.RETURN),
                Row(Event.HOLD, None),
                Row(Event.SKIP, Exit.RETURN_SKIPPED, (Action(Verb.SKIP_LEG),)),
            ),
        ),
    ),
)


def _loop(name: str, test: Test) -> Fragment:
    """A loop looks at its bound before each lap but the first: a bound that leaves no room for a lap is refused.

    So going in leads straight to a step, and loops within loops need no time to pass at their heads.
    """
    return Fragment(
        name,
        (
            State(
                "enter",
                (Row(Event.AT_ONCE, Exit.BODY, (Action(Verb.COUNT_LAP),)),),
                (Action(Verb.ENTER_LOOP),),
                resume=HEAD,
            ),
            State(
                "next lap",
                (
                    Row(Event.AT_ONCE, Exit.BODY, (Action(Verb.COUNT_LAP),), Guard(test)),
                    Row(Event.AT_ONCE, Exit.NEXT),
                ),
                resume=HEAD,
            ),
        ),
    )


LOOP_TIMES = _loop("repeat, times", Test.LAPS_LEFT)
LOOP_WHILE = _loop("repeat, until", Test.TIME_LEFT)


def ending_fragment(ending: Ending) -> Fragment:
    """An end of the mission: halt the robot, say so, and stay."""
    return Fragment(
        f"end, {ending.value}",
        (State(ending.value, (), (Action(Verb.HALT), Action(Verb.END_MISSION, ending=ending))),),
    )


ENDINGS: dict[Ending, Fragment] = {ending: ending_fragment(ending) for ending in Ending}
