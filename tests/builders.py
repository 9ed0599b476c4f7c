"""Small missions made in code, for tests of the machine, the engine and the host."""

from __future__ import annotations

from collections.abc import Iterable
from math import pi

from runner.language.expressions import Condition, Expression, Kind, Operator, Quantity
from runner.language.mission import (
    Go,
    Limits,
    Mark,
    Mission,
    Otherwise,
    Overrun,
    Prove,
    Recovery,
    RecoveryKind,
    Repeat,
    Rest,
    RetryRule,
    Source,
    StandingOrder,
    Step,
    Visit,
    Wait,
)
from runner.site.values import Battery, Lidar, Place, Pose, RobotDescription, Site, Wall

FILE = "test.yaml"

ROBOT = RobotDescription(
    name="test cart",
    footprint=((0.35, 0.25), (-0.35, 0.25), (-0.35, -0.25), (0.35, -0.25)),
    speed=0.9,
    reverse_speed=0.3,
    acceleration=0.6,
    turn_speed=1.2,
    turn_acceleration=2.0,
    lidar=Lidar(field_of_view=1.5 * pi, beams=180, range_max=8.0, rate=10.0, noise=0.01, forward=0.2),
    battery=Battery(capacity=500.0, idle=20.0, driving=80.0, charging=200.0),
)

HOME = Place("home", Pose(1.5, 1.5, 0.0))
FAR = Place("far end", Pose(8.5, 1.5, 0.0))
SIDE = Place("side", Pose(5.0, 2.2, 0.0))

LADDER = (
    Recovery(RecoveryKind.REPLAN),
    Recovery(RecoveryKind.CLEAR, 3.0),
    Recovery(RecoveryKind.EASE_BACK, 0.4),
    Recovery(RecoveryKind.REST, 30.0),
)


def mark(line: int = 1) -> Mark:
    return Mark(FILE, line, 1)


def rule(
    name: str = "patient",
    tries: int = 3,
    recover: tuple[Recovery, ...] = LADDER,
    rest: Rest | None = None,
    give_up_after: float | None = None,
) -> RetryRule:
    return RetryRule(
        name=name,
        tries=tries,
        rest=rest or Rest(20.0, 2.0, 120.0),
        stall_progress=0.3,
        stall_window=12.0,
        recover=recover,
        give_up_after=give_up_after,
        mark=mark(),
    )


def go(
    place: Place = FAR,
    under: RetryRule | None = None,
    within: float | None = None,
    otherwise: Otherwise | tuple[Step, ...] | None = None,
    line: int = 1,
) -> Go:
    return Go(mark(line), place, under or rule(), within, otherwise)


def visit(
    places: Iterable[Place], under: RetryRule | None = None, otherwise: Otherwise | tuple[Step, ...] | None = None
) -> Visit:
    return Visit(mark(), tuple((mark(), place) for place in places), under or rule(), None, otherwise)


def wait(seconds: float) -> Wait:
    return Wait(mark(), seconds)


def compare(quantity: Quantity, operator: str, value: float, word: str = "") -> Expression:
    return Expression(Kind.COMPARE, quantity=quantity, operator=Operator(operator), value=value, word=word)


def condition(expression: Expression, lasting: float = 0.0) -> Condition:
    return Condition(expression, lasting, "a condition")


def repeat(
    *steps: Step,
    times: int | None = None,
    seconds: float | None = None,
    until_clock: float | None = None,
    until: Condition | None = None,
    every: float | None = None,
    overrun: Overrun = Overrun.AT_ONCE,
) -> Repeat:
    if until_clock is not None:
        until = condition(compare(Quantity.CLOCK, ">=", until_clock))
    return Repeat(mark(), times, seconds, until, steps, every, overrun)


def hall() -> Site:
    """A hall of 10 x 3 m with walls around it."""
    outline = Wall(((0.0, 0.0), (10.0, 0.0), (10.0, 3.0), (0.0, 3.0), (0.0, 0.0)), 0.1)
    return Site("hall", 10.0, 3.0, (outline,), (), (), (HOME, FAR, SIDE))


def mission(
    *steps: Step,
    end_by: float | None = None,
    speed: float | None = None,
    site: Site | None = None,
    orders: tuple[StandingOrder, ...] = (),
    prove: Prove | None = None,
) -> Mission:
    return Mission(
        name="test mission",
        site=site or hall(),
        robot=ROBOT,
        start=HOME,
        start_mark=mark(),
        limits=Limits(speed, end_by),
        rules=(),
        steps=steps,
        sources=(Source(FILE, "mission: test mission\n"),),
        prove=prove,
        orders=orders,
    )
