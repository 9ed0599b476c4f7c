"""Plays the same inputs to the engine and to the second interpreter, and compares what they say after each.

Compared are the commands in their order, the notes in their order, and when time alone is next to have an effect.
"""

from __future__ import annotations

import random
from collections import Counter
from dataclasses import dataclass, fields, is_dataclass, replace
from hashlib import sha256
from itertools import count
from math import inf
from typing import Any

from runner.engine.advance import advance
from runner.engine.values import (
    Command,
    Effect,
    Ended,
    Halt,
    Input,
    OperatorActed,
    OrderBegan,
    RecoveryBegan,
    StepBegan,
)
from runner.engine.watching import next_deadline
from runner.language.mission import Ask, Charge, Go, Mark, Mission, Visit, Wait
from runner.machine.compiler import compile_mission
from runner.machine.table import Machine
from runner.machine.table_checks import check_table
from runner.site.values import Place
from tests.engine.random_missions import Maker, Play, lengths
from tests.engine.second_interpreter.interpreter import Interpreter

LEFT_OUT = ("step", "reason", "detail", "ended_by", "diagnosis", "reasons")
"""Fields of notes that LANGUAGE.md does not define: wording, and the numbers of blocks."""

AS_WRITTEN = "as written"
"""The author's reason in the random missions; other reasons are the engine's wording."""


def numbered(tree: Any, lines: count[int]) -> Any:
    """The same tree with every step on a line of its own, so that a note tells which step it means."""
    if isinstance(tree, Mark):
        return replace(tree, line=next(lines))
    if isinstance(tree, tuple):
        return tuple(numbered(part, lines) for part in tree)
    if is_dataclass(tree) and not isinstance(tree, type) and type(tree).__module__ == Mark.__module__:
        return replace(tree, **{one.name: numbered(getattr(tree, one.name), lines) for one in fields(tree)})
    return tree


def length(one: Place, other: Place) -> float:
    """The lengths that the machine is made with."""
    return lengths(None, (one, other))[0][1]  # type: ignore[arg-type]


def told(machine: Machine, effect: Effect) -> Effect:
    """An effect of the engine without what LANGUAGE.md leaves open; blocks and steps become lines."""
    match effect:
        case StepBegan(step=step):
            return replace(effect, step=0, text="", line=machine.steps[step].mark.line)
        case OrderBegan():
            return replace(effect, step=None)
        case Ended(reason=reason):
            return replace(effect, reason=reason if reason == AS_WRITTEN else "")
        case OperatorActed(action=action):
            return replace(effect, action=action.split()[0])
        case RecoveryBegan(recovery=recovery):
            effect = replace(effect, recovery=recovery.rstrip("0123456789.ms "))
    left_out = {one.name: type(getattr(effect, one.name))() for one in fields(effect) if one.name in LEFT_OUT}
    return replace(effect, **left_out)


def timely(tree: Any) -> frozenset[int]:
    """The lines of steps that take time. When the others are noted, LANGUAGE.md does not say."""
    if isinstance(tree, tuple):
        return frozenset().union(*map(timely, tree))
    if not is_dataclass(tree) or isinstance(tree, Mark):
        return frozenset()
    lines = timely(tuple(getattr(tree, one.name) for one in fields(tree)))
    if isinstance(tree, Visit) and not tree.each:
        return lines | {mark.line for mark, _ in tree.places}
    return lines | {tree.mark.line} if isinstance(tree, Go | Wait | Ask | Charge) else lines


def split(effects: list[Effect]) -> tuple[list[Effect], list[Effect]]:
    """Commands and notes; of halts one after the other the first, as a robot that halts cannot halt more."""
    commands: list[Effect] = [effect for effect in effects if isinstance(effect, Command)]
    commands = [one for one, before in zip(commands, [None, *commands], strict=False) if one != Halt() or before != one]
    return commands, [effect for effect in effects if not isinstance(effect, Command)]


class Both(Play):
    """A sequence of inputs to both; ends with AssertionError where they differ."""

    def __init__(self, mission: Mission, machine: Machine, chance: random.Random, seen: Counter[str]) -> None:
        super().__init__(machine, chance, seen)
        self.timely = timely(mission)
        self.shuffled: Counter[int] = Counter()
        self.second = Interpreter(mission, length, self.order)

    def order(self, seed: int, line: int, places: int) -> list[int]:
        """The order of a shuffled visit. LANGUAGE.md leaves it to chance, so it is the engine's own: of the blocks made
        of this step (each leg of a visit has an `otherwise` of its own), the one that the engine has begun once more.
        """
        number = next(
            number
            for number, visit in sorted(self.state.visits.items())
            if self.line(number) == line and visit.begun > self.shuffled[number]
        )
        self.shuffled[number] += 1
        drawn = [f"{seed},{number},{self.shuffled[number]},{index}".encode() for index in range(places)]
        return sorted(range(places), key=lambda index: sha256(drawn[index]).digest())

    def line(self, block: int) -> int | None:
        step = self.machine.blocks[block].step
        return None if step is None else self.machine.steps[step].mark.line

    def give(self, given: Input) -> None:
        self.inputs.append(given)
        self.state, effects = advance(self.machine, self.state, given)
        self.last_goal = max(self.last_goal, self.state.goal or 0)
        ours = self.second.take(given)
        theirs = [told(self.machine, effect) for effect in effects]
        theirs = [one for one in theirs if not isinstance(one, StepBegan) or one.line in self.timely]
        assert split(theirs) == split(ours), f"\n given: {given}\nengine: {theirs}\nsecond: {ours}"
        self.seen["inputs"] += 1
        due = next_deadline(self.machine, self.state)
        due = inf if due is None else due
        assert due == self.second.next_due(), f"\n given: {given}\nengine due: {due}, second: {self.second.next_due()}"


@dataclass(frozen=True)
class Made:
    """A random mission with a line for each step, and its machine."""

    mission: Mission
    machine: Machine


def made(chance: random.Random) -> Made:
    while True:
        mission = numbered(Maker(chance).mission(), count(2))
        machine = compile_mission(mission, lengths)
        if not check_table(machine):
            return Made(mission, machine)


def compare(seed: int, seen: Counter[str], sequences: int) -> None:
    """One random mission and some sequences of inputs to both."""
    chance = random.Random(seed)  # noqa: S311 - tests, not secrets
    one = made(chance)
    for _ in range(sequences):
        both = Both(one.mission, one.machine, chance, seen)
        both.run(chance.randint(5, 60))
        seen["sequences"] += 1
