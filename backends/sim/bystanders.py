"""Bystanders: each stands still at a spot for a time, then walks off to a place and goes home."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from backends.sim.errands import Errands
from backends.sim.kernels.overlap import gap
from backends.sim.outline import Outline
from backends.sim.world import is_due, taken_at
from runner.site.values import Bystander

ELBOW_M = 0.05
"""Nobody steps in nearer to the robot than this."""


class Bystanders:
    """All bystanders of the conditions: persons `first` and on."""

    def __init__(self, bystanders: Sequence[Bystander], first: int, errands: Errands) -> None:
        self._awaited = list(enumerate(bystanders, first))
        self._leaving: list[int] = []
        self._errands = errands

    def advance(self, now: float, robot: NDArray[np.float64], outline: Outline) -> None:
        """Let those step in whose time has come."""
        if not self._awaited:
            return
        x, y, heading = robot.tolist()
        for one, bystander in list(self._awaited):
            if bystander.until_s is not None and now >= bystander.until_s:
                self._awaited.remove((one, bystander))
            elif is_due(bystander, now, (x, y)):
                radius = self._errands.feet.bodies[one, 2]
                if gap(outline.hull, x, y, heading, *bystander.at) > radius + ELBOW_M:
                    self._errands.feet.appear(one, bystander.at)
                    self._errands.feet.stand(one, taken_at(bystander, now))
                    self._awaited.remove((one, bystander))

    def decide(self, one: int, now: float, robot: NDArray[np.float64]) -> None:
        """Somebody has stood long enough, or is on the way off."""
        feet = self._errands.feet
        if feet.walks(one):
            if self._errands.carry_on(one, now, robot):
                feet.stand(one, now)
        elif one not in self._leaving:
            self._leaving.append(one)
            self._errands.send_off(one, robot, now)
        else:
            self._errands.leave_floor(one, now, robot, math.inf)
