"""Random missions of every construct, and random events thrown at them: what must hold, whatever happens.

`python -m tests.engine.random_missions --count 2000000 --seed 1` plays that many sequences and prints what it saw. One
seed makes one mission and ten sequences; a failure prints the seed, which reproduces it.

The invariants, checked after every input:
- the state given is not changed; a state that waits has no row to be taken at once; the engine raises nothing;
- tries and recoveries stay within the bounds of the leg's rule; laps within those of the loop;
- a goal is sent only when none is under way, and ids rise by one;
- an order returns to the very block it left (`carry on`), or begins its step anew (`repeat step`); orders never nest;
- after the sequence, left alone with a robot that refuses everything, the mission ends, or time passes.
"""

from __future__ import annotations

import argparse
import random
import sys
import time
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field, replace

from runner.engine.advance import advance
from runner.engine.state import EngineState, initial_state
from runner.engine.values import (
    ActionNews,
    Answer,
    Begin,
    ClockMoved,
    Effect,
    Go,
    GoalNews,
    Halt,
    Input,
    Operator,
    OrderBegan,
    OrderEnded,
    Seen,
    Tick,
)
from runner.engine.watching import next_deadline
from runner.language.expressions import Condition, Expression, Kind, Quantity
from runner.language.expressions import Operator as Comparison
from runner.language.mission import (
    Ask,
    Charge,
    Count,
    End,
    Mission,
    Notify,
    Order,
    Otherwise,
    Overrun,
    Prove,
    Recovery,
    RecoveryKind,
    Repeat,
    Rest,
    RetryRule,
    Run,
    StandingOrder,
    Step,
    Then,
    Visit,
    Wait,
    When,
)
from runner.machine.compiler import compile_mission
from runner.machine.table import GOAL_ENDS, Event, Machine, Register, Verb
from runner.machine.table_checks import check_table
from runner.site.values import Place, Pose
from tests.builders import FAR, HOME, SIDE, go, mark, mission, rule

PLACES = (HOME, FAR, SIDE)
ANSWERS = ("yes", "no", "later")
COUNTS = ("trays", "visits")
SEQUENCES_A_MISSION = 10


# --- missions -----------------------------------------------------------------------------------------------------


@dataclass
class Maker:
    """Draws the parts of one mission from one source of chance."""

    chance: random.Random
    rules: list[RetryRule] = field(default_factory=list)

    def mission(self) -> Mission:
        self.rules = [self.rule(f"rule {number}") for number in range(self.chance.randint(1, 3))]
        steps = self.steps(0)
        orders = tuple(self.order(number) for number in range(self.chance.choice((0, 0, 1, 2, 3))))
        end_by = self.chance.choice((None, 64_900.0, 70_000.0, 20_000.0))
        claim = Prove(self.chance.choice((0.5, 0.9)), 0.8)
        return mission(*steps, end_by=end_by, orders=orders, prove=claim)

    def rule(self, name: str) -> RetryRule:
        kinds = [self.chance.choice(list(RecoveryKind)) for _ in range(self.chance.randint(0, 4))]
        recover = tuple(Recovery(kind, self.chance.choice((0.5, 3.0, 20.0))) for kind in kinds)
        rest = Rest(self.chance.choice((1.0, 20.0)), self.chance.choice((1.0, 2.0)), 60.0)
        return rule(name, self.chance.randint(1, 3), recover, rest, self.chance.choice((None, 30.0, 400.0)))

    def steps(self, depth: int) -> tuple[Step, ...]:
        return tuple(self.step(depth) for _ in range(self.chance.randint(1, 3 if depth < 2 else 2)))

    def step(self, depth: int) -> Step:
        flat = (
            self.leg,
            self.leg,
            self.visit,
            self.wait,
            self.wait_until,
            self.ask,
            self.charge,
            self.count,
            self.notify,
        )
        nested = (self.repeat, self.when, self.run)
        kinds = flat + nested if depth < 3 else flat
        if self.chance.random() < 0.02:
            return End(mark(), self.chance.random() < 0.5, "as written")
        return self.chance.choice(kinds)(depth)

    def otherwise(self, depth: int) -> Otherwise | tuple[Step, ...] | None:
        if depth < 2 and self.chance.random() < 0.2:
            return self.steps(depth + 1)
        return self.chance.choice((None, Otherwise.SKIP, Otherwise.SKIP, Otherwise.END))

    def leg(self, depth: int) -> Step:
        within = self.chance.choice((None, 30.0, 300.0))
        one = go(self.chance.choice(PLACES), self.chance.choice(self.rules), within, self.otherwise(depth))
        if self.chance.random() < 0.1:
            return replace(one, place=Place("ahead 2 m", Pose(2.0, 0.0, 0.0)), relative=True)
        return one

    def visit(self, depth: int) -> Step:
        places = tuple((mark(), self.chance.choice(PLACES)) for _ in range(self.chance.randint(1, 4)))
        each = tuple(self.steps(depth + 2) for _ in places) if self.chance.random() < 0.3 else ()
        order = self.chance.choice((Order.LISTED, Order.NEAREST, Order.SHUFFLED))
        return Visit(mark(), places, self.chance.choice(self.rules), None, self.otherwise(depth), order, each)

    def wait(self, _: int) -> Step:
        return Wait(mark(), self.chance.choice((0.5, 5.0, 60.0)))

    def wait_until(self, depth: int) -> Step:
        up_to = self.chance.choice((None, 10.0, 100.0))
        return Wait(mark(), None, self.condition(lasting=True), up_to, self.otherwise(depth))

    def ask(self, _: int) -> Step:
        return Ask(mark(), "Taken?", ANSWERS, self.chance.choice((5.0, 90.0)), self.chance.choice(ANSWERS))

    def charge(self, depth: int) -> Step:
        up_to = self.chance.choice((None, 50.0))
        until = self.condition(lasting=True)
        return Charge(mark(), HOME, self.chance.choice(self.rules), until, up_to, self.otherwise(depth))

    def count(self, _: int) -> Step:
        return Count(mark(), self.chance.choice(COUNTS), self.chance.choice((1, 1, 3)))

    def notify(self, _: int) -> Step:
        return Notify(mark(), "a word")

    def repeat(self, depth: int) -> Step:
        times, seconds, until = None, None, None
        match self.chance.choice(("times", "for", "until")):
            case "times":
                times = self.chance.randint(1, 4)
            case "for":
                seconds = self.chance.choice((1.0, 200.0))
            case _:
                until = self.condition()
        every = self.chance.choice((None, None, 30.0))
        return Repeat(mark(), times, seconds, until, self.steps(depth + 1), every, self.chance.choice(list(Overrun)))

    def when(self, depth: int) -> Step:
        otherwise = self.steps(depth + 1) if self.chance.random() < 0.5 else ()
        return When(mark(), self.condition(), self.steps(depth + 1), otherwise)

    def run(self, depth: int) -> Step:
        return Run(mark(), "a routine", self.steps(depth + 1))

    def order(self, number: int) -> StandingOrder:
        then = self.chance.choice(list(Then))
        return StandingOrder(mark(), f"order {number}", self.condition(lasting=True), self.steps(2), then)

    def condition(self, lasting: bool = False) -> Condition:
        held = self.chance.choice((0.0, 0.0, 4.0)) if lasting else 0.0
        return Condition(self.expression(0), held, "a condition")

    def expression(self, depth: int) -> Expression:
        kind = self.chance.choice(list(Kind)) if depth < 2 else Kind.COMPARE
        match kind:
            case Kind.AND | Kind.OR:
                return Expression(kind, tuple(self.expression(depth + 1) for _ in range(2)))
            case Kind.NOT:
                return Expression(kind, (self.expression(depth + 1),))
            case Kind.LAST_LEG:
                return Expression(kind, word=self.chance.choice(("arrived", "failed", "skipped")))
            case Kind.ANSWER:
                return Expression(kind, word=self.chance.choice(ANSWERS))
            case Kind.PROVEN:
                return Expression(kind)
            case Kind.COMPARE:
                return self.comparison()

    def comparison(self) -> Expression:
        quantity = self.chance.choice(list(Quantity))
        operators = (Comparison.BELOW, Comparison.AT_LEAST) if quantity is Quantity.CLOCK else tuple(Comparison)
        value = {
            Quantity.BATTERY: self.chance.random(),
            Quantity.CLOCK: self.chance.choice((64_850.0, 66_000.0, 3_600.0)),
            Quantity.ELAPSED: self.chance.choice((0.0, 60.0, 600.0)),
            Quantity.LAPS: float(self.chance.randint(0, 3)),
            Quantity.COUNT: float(self.chance.randint(0, 6)),
        }[quantity]
        word = self.chance.choice(COUNTS) if quantity is Quantity.COUNT else ""
        return Expression(Kind.COMPARE, (), quantity, self.chance.choice(operators), value, word)


def lengths(_: Mission, places: tuple[Place, ...]) -> tuple[tuple[float, ...], ...]:
    """Straight lengths instead of routes over a floor, to be quick."""
    return tuple(
        tuple(abs(one.pose.x - other.pose.x) + abs(one.pose.y - other.pose.y) for other in places) for one in places
    )


def random_machine(chance: random.Random) -> Machine:
    """The machine of a random mission that passes the checks."""
    while True:
        machine = compile_mission(Maker(chance).mission(), lengths)
        if not check_table(machine):
            return machine


# --- events -------------------------------------------------------------------------------------------------------


class Play:
    """One sequence of events against one machine, with the invariants looked at after each."""

    def __init__(self, machine: Machine, chance: random.Random, seen: Counter[str]) -> None:
        self.machine = machine
        self.chance = chance
        self.seen = seen
        self.state = initial_state(machine)
        self.now = 0.0
        self.under_way: int | None = None
        self.last_goal = 0
        self.left_by_order: int | None = None
        self.inputs: list[Input] = []

    def run(self, length: int) -> EngineState:
        self.give(Begin(0.0, 64_800.0, self.chance.randint(0, 9)))
        for _ in range(length):
            if self.state.ended is not None:
                break
            for given in self.next_inputs():
                self.give(given)
        return self.state

    def next_inputs(self) -> Iterator[Input]:
        self.now += self.chance.choice((0.0, 0.0, 0.25, 1.0, 7.0, 40.0))
        what = self.chance.random()
        deadline = next_deadline(self.machine, self.state)
        if what < 0.25 and deadline is not None:
            self.now = max(self.now, deadline)
            yield Tick(self.now)
        elif what < 0.45:
            current = self.state.goal if self.chance.random() < 0.9 else self.chance.randint(0, self.last_goal)
            ends = (Event.ARRIVED, Event.ARRIVED, Event.ARRIVED, *GOAL_ENDS, None)
            yield GoalNews(self.now, current or 0, self.chance.choice(ends))
        elif what < 0.6:
            yield ActionNews(self.now, self.state.action or 0, self.chance.random() < 0.7)
        elif what < 0.88:
            remaining = self.chance.choice((None, 0.5, 5.0, 4.0, 30.0))
            route = self.chance.randint(0, 2)
            level = self.chance.random()
            yield Seen(self.now, Pose(1.0, 1.0, 0.0), 0.0, 0.3, level, self.now / 3, remaining, route, (), ())
        elif what < 0.92:
            yield Answer(self.now, self.chance.choice((*ANSWERS, "nonsense")), "someone")
        elif what < 0.93:
            yield ClockMoved(self.now, self.chance.choice((-3600.0, 3600.0, 5.0)))
        else:
            people = (Event.HOLD, Event.RELEASE, Event.RELEASE, Event.SKIP, Event.SKIP)
            yield Operator(
                self.now, Event.ABORT if self.chance.random() < 0.02 else self.chance.choice(people), "someone"
            )

    def give(self, given: Input) -> None:
        before = self.state
        self.inputs.append(given)
        self.state, effects = advance(self.machine, before, given)
        self.seen[type(given).__name__] += 1
        if isinstance(given, GoalNews) and given.event is not None and given.goal_id == self.under_way:
            self.under_way = None
        for effect in effects:
            self.follow(effect)
        self.look()

    def follow(self, effect: Effect) -> None:
        self.seen[type(effect).__name__] += 1
        match effect:
            case Halt():
                self.under_way = None
            case Go(goal_id=goal_id):
                assert self.under_way is None, "a goal is sent while another is under way"
                assert goal_id == self.last_goal + 1, "goal ids rise by one"
                self.under_way = self.last_goal = goal_id
            case OrderBegan():
                assert self.left_by_order is None, "an order within an order"
                self.left_by_order = 1
            case OrderEnded():
                assert self.left_by_order is not None, "an order ended that had not begun"
                self.left_by_order = None

    def look(self) -> None:
        state, machine = self.state, self.machine
        block = machine.blocks[state.address[0]]
        fragment = machine.fragments[block.fragment]
        local = fragment.states[state.address[1]]
        if state.ended is None:
            assert local.rows, "a state without a way out"
            assert all(row.event is not Event.AT_ONCE for row in local.rows), "time passes where it must not"
        if state.leg is not None and fragment.watch is not None:
            assert 0 <= state.registers[Register.RECOVERIES] <= fragment.recoveries_at_most
            assert 1 <= state.registers[Register.TRIES] <= fragment.tries_at_most
        for number, loop in state.loops.items():
            times = machine.blocks[number].times
            assert loop.laps >= 0
            assert times is None or loop.laps <= times
        assert (state.interrupted is None) == (self.left_by_order is None)
        assert all(deadline >= 0.0 for deadline in state.timers.values())

    def wind_down(self) -> None:
        """A robot that says no to everything, and nobody else: the mission ends, or its time passes."""
        self.give(Operator(self.now, Event.RELEASE, "someone"))
        last, still = self.now, 0
        for _ in range(400):
            if self.state.ended is not None:
                return
            deadline = next_deadline(self.machine, self.state)
            if self.state.action is not None or self.state.goal is not None:
                self.now += 0.25  # a robot takes time to say no
            if self.state.action is not None:
                self.give(ActionNews(self.now, self.state.action, False))
            elif self.state.goal is not None:
                self.give(GoalNews(self.now, self.state.goal, Event.REFUSED))
            elif deadline is not None:
                self.now = max(self.now, deadline)
                self.give(Tick(self.now))
            else:
                assert self._waits_for_the_world(), "nothing will ever happen"
                return
            still = still + 1 if self.now == last else 0
            last = self.now
            assert still < 200, "no time passes"

    def _waits_for_the_world(self) -> bool:
        """A wait without a bound, for a condition that time alone does not change."""
        block = self.machine.blocks[self.state.address[0]]
        local = self.machine.fragments[block.fragment].states[self.state.address[1]]
        charging = any(action.verb is Verb.CHARGE for action in local.on_entry)
        return local.watches and block.seconds is None and (charging or block.condition is not None)


def play(seed: int, seen: Counter[str], sequences: int = SEQUENCES_A_MISSION) -> None:
    """One random mission and some sequences against it. AssertionError where an invariant breaks."""
    chance = random.Random(seed)  # noqa: S311 - tests, not secrets
    machine = random_machine(chance)
    for _ in range(sequences):
        one = Play(machine, chance, seen)
        one.run(chance.randint(5, 60))
        if one.state.ended is None:
            one.wind_down()
        seen["sequences"] += 1
        seen[f"ended: {one.state.ended.value}" if one.state.ended else "not ended"] += 1


def main() -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.engine.random_missions")
    parser.add_argument("--count", type=int, default=20_000, help="sequences")
    parser.add_argument("--seed", type=int, default=1, help="the first seed")
    wanted = parser.parse_args()
    seen: Counter[str] = Counter()
    started = time.monotonic()
    for seed in range(wanted.seed, wanted.seed + wanted.count // SEQUENCES_A_MISSION):
        try:
            play(seed, seen)
        except Exception:
            print(f"seed {seed}", file=sys.stderr)
            raise
    print(f"{seen['sequences']} sequences in {time.monotonic() - started:.0f} s")
    for name, count in sorted(seen.items()):
        print(f"  {name:<28} {count}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
