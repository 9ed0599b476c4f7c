"""In hours of busy conditions the true footprint overlaps no wall, no known furniture and nobody who stood still.

Judged by shapely, from the robot's own footprint and the raster of what really stands there. People who walk may come
into the robot; how often they do is printed, and they are told apart by whether they moved in the tick. By default a
sample; with `-m soak`, 200 hours.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path

import numpy as np
import pytest
import shapely
from numpy.typing import NDArray

import missions
from backends.contract import Goal, Setup
from backends.sim.simulator import Simulator
from runner.language.reader import load_conditions, load_robot, load_site
from runner.site.values import CELL_M
from tests.backends.sim.support import is_end

CONTACT_M = 1e-6
"""Overlaps no deeper than this are rounding."""
STUCK_S, FREED_AFTER_S = 60.0, 300.0
MISSIONS = Path(missions.__file__).parent


@dataclass
class Overlaps:
    """What was seen: places at which something was overlapped that must not be, and people who walked into it."""

    ticks: int = 0
    near_solids: int = 0
    near_people: int = 0
    solid: list[tuple[float, NDArray[np.float64]]] = field(default_factory=list)
    standing: list[tuple[float, NDArray[np.float64]]] = field(default_factory=list)
    walked_in: int = 0
    freed: int = 0
    """How often somebody carried the robot to a place after it had stood for `FREED_AFTER_S`."""
    meters: float = 0.0


class Judge:
    """Looks at one simulator after each tick in which the robot moved."""

    def __init__(self, simulator: Simulator) -> None:
        self.seen = Overlaps()
        self._simulator = simulator
        self._footprint = shapely.Polygon(simulator.setup.robot.footprint)
        self._reach = max(math.hypot(x, y) for x, y in simulator.setup.robot.footprint)
        self._place = simulator.body.place.copy()
        self._people = simulator.people.bodies.copy()
        self._driven, self._since = 0.0, 0.0

    def look(self) -> None:
        simulator, seen = self._simulator, self.seen
        place, people = simulator.body.place, simulator.people.bodies
        close = np.flatnonzero(np.hypot(people[:, 0] - place[0], people[:, 1] - place[1]) < self._reach + 0.4)
        moved = not np.array_equal(place, self._place)
        seen.ticks += 1
        if moved or len(close):
            now, shape = simulator.clock.now(), self._shape(place)
            if moved and self._overlaps_solid(shape, place):
                seen.solid.append((now, place.copy()))
            for index in close.tolist():
                self._look_at(index, shape, now, people)
        self._place[:], self._people[:] = place, people

    def stands_long(self) -> bool:
        """Whether the robot has not got on for long."""
        driven, now = self._simulator.body.driven, self._simulator.clock.now()
        if driven - self._driven > 1.0:
            self._driven, self._since = driven, now
        return now - self._since >= FREED_AFTER_S

    def free(self, place: int) -> None:
        """Carry the robot to a place, if that is free, and tell it so."""
        simulator, pose = self._simulator, self._simulator.setup.site.places[place].pose
        people = simulator.people.bodies
        if (np.hypot(people[:, 0] - pose.x, people[:, 1] - pose.y) < self._reach + 0.5).any():
            return
        shape = self._shape(np.array([pose.x, pose.y, pose.heading]))
        if not self._overlaps_solid(shape, np.array([pose.x, pose.y, pose.heading])):
            simulator.body.carry(pose)
            simulator.localization.relocate(pose)
            self.seen.freed += 1
            self._since = simulator.clock.now()

    def _look_at(self, index: int, shape: shapely.Polygon, now: float, people: NDArray[np.float64]) -> None:
        x, y, radius = people[index]
        self.seen.near_people += 1
        if shape.distance(shapely.Point(x, y)) >= radius - 1e-5:
            return
        if np.array_equal(people[index], self._people[index]):
            self.seen.standing.append((now, people[index].copy()))
        else:
            self.seen.walked_in += 1

    def _shape(self, place: NDArray[np.float64]) -> shapely.Polygon:
        turned = shapely.affinity.rotate(self._footprint, place[2], origin=(0, 0), use_radians=True)
        return shapely.affinity.translate(turned, place[0], place[1]).buffer(-CONTACT_M)

    def _overlaps_solid(self, shape: shapely.Polygon, place: NDArray[np.float64]) -> bool:
        """Against the squares of the blocked cells around."""
        cells = math.ceil(self._reach / CELL_M) + 1
        row, column = int(place[1] / CELL_M), int(place[0] / CELL_M)
        low_row, low_column = max(row - cells, 0), max(column - cells, 0)
        part = self._simulator.world.blocked[low_row : row + cells + 1, low_column : column + cells + 1]
        if not part.any():
            return False
        self.seen.near_solids += 1
        rows, columns = np.nonzero(part)
        x, y = (columns + low_column) * CELL_M, (rows + low_row) * CELL_M
        return bool(shapely.intersects(shape, shapely.box(x, y, x + CELL_M, y + CELL_M)).any())


def watch(conditions_name: str, seed: int, hours: float) -> Overlaps:
    """Drive from place to place for some hours, and look at every tick."""
    site = load_site(MISSIONS / "sites/harbour-clinic.yaml")
    robot = load_robot(MISSIONS / "robots/small-cart.yaml")
    conditions = load_conditions(MISSIONS / f"conditions/{conditions_name}.yaml", site)
    simulator = Simulator(Setup(site, robot, site.places[0].pose, conditions, seed, datetime(2026, 1, 5, 18, 0)))
    judge, random, number, leave_at = Judge(simulator), np.random.default_rng(seed), 0, 0.0
    for tick in range(1, round(hours * 36_000.0) + 1):
        ended = any(is_end(report) for report in simulator.reports(tick / 10.0))
        judge.look()
        if tick % 600 == 0 and judge.stands_long():
            judge.free(int(random.integers(len(site.places))))
        if ended or tick / 10.0 >= leave_at:
            number += 1
            simulator.body.charge.energy = robot.battery.capacity
            simulator.ease_back(2 * number, 0.3)
            simulator.clear(2 * number + 1, 3.0)
            simulator.go(Goal(number, site.places[int(random.integers(len(site.places)))].pose, robot.speed))
            leave_at = tick / 10.0 + STUCK_S
    judge.seen.meters = simulator.body.driven
    return judge.seen


def judge_all(conditions_name: str, seed: int, hours: float) -> None:
    seen = watch(conditions_name, seed, hours)
    print(
        f"{conditions_name}, seed {seed}, {hours:g} h, {seen.meters / 1000:.1f} km, freed {seen.freed} times: "
        f"{seen.ticks} ticks, {seen.near_solids} near something solid, "
        f"{seen.near_people} near a person; overlaps: solid {len(seen.solid)}, standing people {len(seen.standing)}, "
        f"people who walked in {seen.walked_in}"
    )
    assert seen.solid == []
    assert seen.standing == []
    assert seen.near_solids > 100 * hours


@pytest.mark.parametrize("conditions", ["busy", "twenty-people"])
def test_a_busy_while_goes_by_without_an_overlap(conditions: str) -> None:
    judge_all(conditions, 1, 0.15)


@pytest.mark.soak
@pytest.mark.parametrize("seed", range(10, 20))
def test_two_hundred_busy_hours_go_by_without_an_overlap(seed: int) -> None:
    judge_all("busy" if seed % 2 else "twenty-people", seed, 20.0)
