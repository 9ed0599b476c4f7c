"""What the checks on the floor share: the floor as cells, and the planned way of every leg. Made once for a mission."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from runner.language.mission import Mark, Mission
from runner.machine.approaches import Approach, approaches
from runner.machine.estimates import Route, routes_needed
from runner.machine.table import Machine, Target
from runner.site.floor import Floor, clearance, rasterize
from runner.site.values import Point
from runner.site.ways import Way, plan_ways


@dataclass(frozen=True, slots=True)
class Survey:
    """`blocked` and `clearance` are those of the floor with every door open; `ways` are planned on it."""

    mission: Mission
    machine: Machine
    floor: Floor
    blocked: NDArray[np.bool_]
    clearance: NDArray[np.float32]
    ways: Mapping[Route, Way]
    approaches: Mapping[int, Approach]

    def target(self, place: int | None) -> Target:
        """A place of the machine; the start for None."""
        start = self.mission.start
        return Target(start.name, start.pose) if place is None else self.machine.places[place]

    def legs(self) -> Iterator[tuple[int, int, Mark]]:
        """Block, place and mark of every leg to a place of the site that can be reached."""
        for number, block in enumerate(self.machine.blocks):
            if block.place is not None and not block.relative and block.step is not None and number in self.approaches:
                yield number, block.place, self.machine.steps[block.step].mark

    def routes(self) -> Iterator[tuple[Route, Mark]]:
        """Every planned way between two places, with the mark of the first leg that takes it."""
        seen: set[Route] = set()
        for number, place, mark in self.legs():
            for before in self.approaches[number].places:
                route = (before, place)
                if before != place and route not in seen:
                    seen.add(route)
                    yield route, mark


def make_survey(mission: Mission, machine: Machine) -> Survey:
    """Rasterize the floor and plan the ways: most of what a check takes."""
    floor = rasterize(mission.site)
    blocked = floor.blocked()
    field = clearance(blocked)

    def point(place: int | None) -> Point:
        pose = mission.start.pose if place is None else machine.places[place].pose
        return pose.x, pose.y

    routes = {route: (point(route[0]), point(route[1])) for route in routes_needed(machine)}
    ways = plan_ways(field, mission.robot.footprint, routes.values())
    found = {route: ways[pair] for route, pair in routes.items()}
    return Survey(mission, machine, floor, blocked, field, found, approaches(machine))
