"""Doors and people: who comes to a door that somebody shut opens it; who went through one may shut it again."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from backends.sim.footwork import Footwork
from backends.sim.kernels.errands import at_doors
from backends.sim.outline import Outline
from backends.sim.world import World
from runner.site.values import Door


class Doorways:
    """The doors of a site and where people are in respect of them. `probability`: that a door is shut behind one."""

    def __init__(self, doors: Sequence[Door], probability: float, people: int, generator: np.random.Generator) -> None:
        self._names = [door.name for door in doors]
        self._probability = probability
        self._random = generator
        self._doors = np.array([[*door.start, *door.end] for door in doors], dtype=np.float64).reshape(-1, 4)
        self._sides = np.zeros((people, len(doors)), dtype=np.int8)
        self._behind = np.full(people, -1, dtype=np.int64)
        """The door each has gone through and not yet left behind; -1 for none."""
        self._wanted = np.zeros(len(doors), dtype=np.bool_)
        self._left = np.zeros(people, dtype=np.int64)

    def advance(self, feet: Footwork, world: World, robot: NDArray[np.float64], outline: Outline) -> None:
        """Open and shut what people open and shut this tick."""
        if self._probability <= 0.0 or not len(self._behind):
            return
        left = at_doors(
            feet.bodies, feet.target, feet.wished, self._doors, self._sides, self._behind, self._wanted, self._left
        )
        if world.ajar:
            for number, name in enumerate(self._names):
                if self._wanted[number] and name in world.ajar:
                    world.open_door(name)
        for number in self._left[:left].tolist():
            if self._random.random() < self._probability and not self._wanted[number]:
                world.shut_door(self._names[number], robot.tolist(), outline, feet.bodies)
