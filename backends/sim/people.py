"""Everybody in the simulated world: walkers, bystanders and crowds, and the doors they open and shut.

How they walk is in `kernels.crowd`; what each is there for decides where to. Everything random comes from the
generators given.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from backends.sim.bystanders import Bystanders
from backends.sim.crowds import Crowds
from backends.sim.doorways import Doorways
from backends.sim.errands import Errands
from backends.sim.footwork import Footwork
from backends.sim.outline import Outline
from backends.sim.walkers import Company
from backends.sim.wayfinding import Wayfinding
from backends.sim.world import World
from runner.site.values import Conditions, Site, Walkers

RADIUS_LEAST_M, RADIUS_MOST_M = 0.25, 0.35
"""Body radius, drawn evenly: 2r of 0.5 to 0.7 m (Helbing, Farkas and Vicsek, Nature 407, 2000)."""
SLOWEST_M_S = 0.4
"""Preferred speeds are drawn from a normal distribution and cut off here and at twice the mean."""


class People:
    """`bodies` has rows (x, y, radius), true now; who is not about is far off the floor."""

    def __init__(
        self,
        conditions: Conditions,
        site: Site,
        world: World,
        begins: float,
        robot: NDArray[np.float64],
        generator: np.random.Generator,
        at_doors: np.random.Generator,
    ) -> None:
        """`robot` is where the robot stands, which nobody starts near. ValueError on a place that is not there."""
        walkers = sum(group.count for group in conditions.walkers)
        others = len(conditions.bystanders) + sum(crowd.count for crowd in conditions.crowds)
        groups = [*conditions.walkers, *([Walkers(others)] if others else [])]
        if groups and not site.places:
            raise ValueError("People need places to walk between, and the site has none.")
        speeds = np.concatenate([np.empty(0), *(drawn_speeds(group, generator) for group in groups)])
        count = walkers + others
        feet = Footwork(generator.uniform(RADIUS_LEAST_M, RADIUS_MOST_M, count), speeds)
        errands = Errands(feet, Wayfinding(site, world, generator), generator)
        self.bodies = feet.bodies
        self.velocity = feet.velocity
        self._feet = feet
        self._world = world
        self._company = Company(conditions.walkers, conditions.about, site, begins, errands, generator)
        self._bystanders = Bystanders(conditions.bystanders, walkers, errands)
        self._crowds = Crowds(conditions.crowds, walkers + len(conditions.bystanders), errands, generator)
        self._doorways = Doorways(site.doors, conditions.doors_shut_by_people, count, at_doors)
        self._roles = [
            *[self._company.decide] * walkers,
            *[self._bystanders.decide] * len(conditions.bystanders),
            *[self._crowds.decide] * (others - len(conditions.bystanders)),
        ]
        self._company.begin(robot)

    def advance(
        self, now: float, robot: NDArray[np.float64], outline: Outline, time: float, whole_second: bool
    ) -> None:
        """Let everybody act for one tick that ends at `now`. `robot` is (x, y, heading)."""
        if not self._roles:
            return
        self._bystanders.advance(now, robot, outline)
        if whole_second:
            self._crowds.advance(now, robot, outline)
        self._feet.step(self._world, robot, outline, time)
        for one in self._feet.due(now):
            self._roles[one](one, now, robot)
        self._doorways.advance(self._feet, self._world, robot, outline)


def drawn_speeds(group: Walkers, generator: np.random.Generator) -> NDArray[np.float64]:
    """What each of a group likes to walk, m/s."""
    drawn = generator.normal(group.speed_mean, group.speed_deviation, group.count)
    return np.clip(drawn, SLOWEST_M_S, 2.0 * group.speed_mean)
