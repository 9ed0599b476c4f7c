"""What the check prints as least and most holds when the mission is driven: on the simulator, in quiet conditions."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path
from random import Random

import pytest

from runner.host.board import Board
from runner.host.launch import Order, carry_out
from runner.journal.reader import open_record
from runner.language.examples import resolve_mission
from runner.language.expressions import Quantity
from runner.language.mission import Ask, Count, Mission, Notify, Repeat, Step, Wait, When
from runner.language.mission import Order as VisitOrder
from runner.language.reader import load_mission
from runner.machine.checks import Estimates, check_mission
from runner.machine.compiler import compile_mission
from runner.site.values import Conditions, Place, Pose, Wall
from tests.builders import HOME, compare, condition, go, hall, mark, mission, repeat, visit, wait

FEW, MANY = range(4), range(50)

ALCOVE, NICHE = Place("alcove", Pose(8.0, 1.0, 0.0)), Place("niche", Pose(2.5, 2.2, math.pi / 2))
MIDDLE, EAST = Place("middle", Pose(5.0, 2.2, math.pi)), Place("east", Pose(9.0, 2.0, -math.pi / 2))
PLACES = (HOME, ALCOVE, NICHE, MIDDLE, EAST)


def random_mission(random: Random) -> Mission:
    """A few steps of every kind that needs no person, in a hall with a wall across part of it."""
    floor = hall()
    wall = Wall(((6.5, 0.0), (6.5, random.uniform(0.6, 1.4))), 0.1)
    site = replace(floor, walls=(*floor.walls, wall), places=PLACES)
    return mission(*_steps(random, 0, random.randint(2, 4)), site=site)


def _steps(random: Random, depth: int, count: int) -> tuple[Step, ...]:
    return tuple(_step(random, depth) for _ in range(count))


def _step(random: Random, depth: int) -> Step:
    makers = [_leg, _leg, _visit, _pause, _ask, _small]
    return random.choice(makers if depth == 2 else [*makers, _loop, _when])(random, depth)


def _leg(random: Random, _: int) -> Step:
    return go(random.choice(PLACES))


def _visit(random: Random, _: int) -> Step:
    made = visit(random.sample(PLACES, random.randint(2, 4)))
    return replace(made, order=random.choice(list(VisitOrder)))


def _pause(random: Random, _: int) -> Step:
    if random.random() < 0.6:
        return wait(float(random.randint(1, 60)))
    clock = condition(compare(Quantity.CLOCK, ">=", 18.0 * 3600.0 + random.randint(1, 20) * 60.0))
    elapsed = condition(compare(Quantity.ELAPSED, ">=", float(random.randint(10, 400))))
    return Wait(mark(), None, random.choice((clock, elapsed)), random.choice((None, 90.0)))


def _ask(random: Random, _: int) -> Step:
    return Ask(mark(), "Ready?", ("yes", "no"), float(random.randint(5, 40)), "no")


def _small(random: Random, _: int) -> Step:
    return random.choice((Count(mark(), "trays", 1), Notify(mark(), "on the way")))


def _loop(random: Random, depth: int) -> Repeat:
    steps = (wait(2.0), *_steps(random, depth + 1, random.randint(1, 2)))
    every = random.choice((None, None, 45.0))
    laps = condition(replace(compare(Quantity.LAPS, ">=", 2.0)))
    match random.randrange(4):
        case 0:
            return repeat(*steps, times=random.randint(1, 3), every=every)
        case 1:
            return repeat(*steps, seconds=float(random.randint(20, 200)), every=every)
        case 2:
            return repeat(*steps, until_clock=18.0 * 3600.0 + random.randint(1, 10) * 60.0)
        case _:
            return repeat(*steps, until=laps)


def _when(random: Random, depth: int) -> When:
    asked = condition(compare(Quantity.COUNT, ">=", 1.0, "trays"))
    return When(mark(), asked, _steps(random, depth + 1, 1), _steps(random, depth + 1, random.randint(0, 1)))


def driven_seconds(written: Mission, folder: Path, seed: int = 1) -> float:
    """How long a run takes, without people and without trouble."""
    order = Order(written, compile_mission(written), Conditions(), None, seed, None)
    carry_out(order, folder, Board(written.name), lambda: None)
    with open_record(folder) as record:
        return max(entry.stamp for entry in record.entries(names=("ended",)))


def estimates_of(written: Mission) -> Estimates:
    made = check_mission(written, compile_mission(written)).estimates
    assert made is not None
    return made


def within_bounds(written: Mission, folder: Path) -> None:
    seconds = estimates_of(written).seconds
    driven = driven_seconds(written, folder)
    assert seconds.least <= driven <= seconds.most, (seconds, driven)


@pytest.mark.parametrize("number", FEW)
def test_a_random_mission_takes_between_the_least_and_the_most(number: int, tmp_path: Path) -> None:
    within_bounds(random_mission(Random(number)), tmp_path)  # noqa: S311  a seed, not a secret


@pytest.mark.parametrize("name", ["short-errand", "evening-round"])
def test_an_example_takes_between_the_least_and_the_most(name: str, tmp_path: Path) -> None:
    within_bounds(load_mission(resolve_mission(name)), tmp_path)


def test_an_example_takes_about_what_is_likely(tmp_path: Path) -> None:
    written = load_mission(resolve_mission("short-errand"))
    assert driven_seconds(written, tmp_path) == pytest.approx(estimates_of(written).seconds.likely, rel=0.15)


@pytest.mark.soak
@pytest.mark.parametrize("number", MANY)
def test_fifty_random_missions_take_between_the_least_and_the_most(number: int, tmp_path: Path) -> None:
    within_bounds(random_mission(Random(1000 + number)), tmp_path)  # noqa: S311  a seed, not a secret


@pytest.mark.soak
def test_the_overnight_example_takes_between_the_least_and_the_most(tmp_path: Path) -> None:
    within_bounds(load_mission(resolve_mission("overnight-endurance")), tmp_path)
