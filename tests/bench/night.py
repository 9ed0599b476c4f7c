"""A simulated night: how many simulated seconds pass in one of a processor core, and where the time of a tick goes.

A scripted drive round the clinic with 20 people about, and the same floor with nothing to do. The parts of a tick are
timed by a wrapper around each, which itself costs about a microsecond a call; the rate is taken without it.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from datetime import datetime
from pathlib import Path
from typing import Any

from backends.contract import Goal, GoalReport, GoalStatus, Setup
from backends.sim.simulator import TICKS_PER_S, Simulator
from runner.language.reader import load_robot, load_site
from runner.site.values import Conditions, Walkers
from tests.bench.harness import Row

MISSIONS = Path(__file__).parents[2] / "missions"
BUSY_S, IDLE_S = 1800.0, 3600.0
ENDS = (GoalStatus.ARRIVED, GoalStatus.NO_ROUTE, GoalStatus.REFUSED, GoalStatus.FAILED, GoalStatus.HALTED)
STUCK_S, REST_S = 60.0, 10.0
PEOPLE = 20


def measure() -> Iterator[Row]:
    prepare().open()
    yield Row("first tick of a new simulator", 1e3 * seconds_of(lambda: rounds(prepare(), 0.1)), "ms")
    for name, people, duration in (("busy", PEOPLE, BUSY_S), ("quiet", 0, BUSY_S)):
        simulator = prepare(people)
        spent = seconds_of(lambda: rounds(simulator, duration))  # noqa: B023
        yield Row(f"{name} rounds", duration / spent, "times real time", goal="over 500" if people else "")
        yield Row(f"{name} rounds: a tick", 1e6 * spent / (duration * TICKS_PER_S), "us")
    spent = seconds_of(lambda: rest(prepare(PEOPLE), IDLE_S))
    yield Row("nothing to do, 20 people", IDLE_S / spent, "times real time")
    yield from by_part()


def by_part() -> Iterator[Row]:
    """Time of a tick of the busy rounds by part, without what is under a part already counted."""
    simulator = prepare(PEOPLE)
    yield from parts_of("busy rounds", simulator, lambda: rounds(simulator, BUSY_S))


def parts_of(what: str, simulator: Simulator, action: Callable[[], object]) -> Iterator[Row]:
    """Rows for the parts of a tick while `action` drives the simulator."""
    parts: dict[str, float] = {}
    for name, holder, method in (
        ("world events", simulator.world, "advance"),
        ("people", simulator.people, "advance"),
        ("localization: prediction", simulator.localization, "predict"),
        ("localization: correction", simulator.localization, "correct"),
        ("lidar", simulator._scanner, "look"),
        ("sweep, with its memory", simulator._sweeper, "look"),
        ("memory", simulator.memory, "take"),
        ("caution", simulator.robot.caution, "fastest"),
        ("planning", simulator.robot._planner, "plan"),
        ("following", simulator.robot._follower, "steer"),
        ("supervising", simulator.robot, "think"),
        ("driving", simulator.body, "advance"),
        ("telemetry", simulator, "_telemetry"),
    ):
        timed(holder, method, name, parts)
    spent = seconds_of(action)
    parts["supervising"] -= parts["planning"] + parts["following"] + parts["caution"]
    parts["the rest"] = spent - sum(parts.values())
    ticks = simulator.clock.now() * TICKS_PER_S
    for name, seconds in parts.items():
        yield Row(f"{what} by part: {name}", 1e6 * seconds / ticks, "us a tick")


def prepare(people: int = 0) -> Simulator:
    conditions = Conditions(walkers=(Walkers(people),) if people else ())
    site = load_site(MISSIONS / "sites/harbour-clinic.yaml")
    robot = load_robot(MISSIONS / "robots/small-cart.yaml")
    return Simulator(Setup(site, robot, site.places[0].pose, conditions, 3, datetime(2026, 1, 5, 18, 0)))


def rounds(simulator: Simulator, until: float) -> None:
    """Drive from place to place, over and over; where there is no route or no progress, clear and go to the next."""
    places = simulator.setup.site.places
    number = 0
    while simulator.clock.now() < until:
        number += 1
        simulator.clear(number, 3.0)
        simulator.go(Goal(number, places[number % len(places)].pose, 0.8))
        leave_at = simulator.clock.now() + STUCK_S
        while simulator.clock.now() < min(until, leave_at):
            news = simulator.reports(min(until, leave_at))
            ends = [report.status for report in news if isinstance(report, GoalReport) and report.status in ENDS]
            if ends:
                rest(simulator, 1.0 if ends == [GoalStatus.ARRIVED] else REST_S)
                break


def rest(simulator: Simulator, duration: float) -> None:
    until = simulator.clock.now() + duration
    while simulator.clock.now() < until:
        simulator.reports(until)


def seconds_of(action: Callable[[], object]) -> float:
    begun = time.process_time()
    action()
    return time.process_time() - begun


def timed(holder: Any, method: str, name: str, parts: dict[str, float]) -> None:
    """Replace a method of one object by itself with a watch."""
    original = getattr(holder, method)
    parts[name] = 0.0

    def watched(*arguments: Any) -> Any:
        begun = time.process_time()
        result = original(*arguments)
        parts[name] += time.process_time() - begun
        return result

    setattr(holder, method, watched)
