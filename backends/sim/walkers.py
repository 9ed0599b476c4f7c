"""Walkers: they stay at a place for a while, then walk to another, alone or together, at the hours they are about."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from backends.sim.errands import Errands
from backends.sim.hours import share_at
from runner.site.values import DAY_S, AboutShare, Site, Walkers

STAY_MEAN_S = 30.0
"""Mean of the exponential time spent at a place."""
PLACE_TRIES = 20
COME_BACK_S = 60.0
"""Somebody who is not about is asked again after a time around this."""


class Company:
    """All walkers of the conditions: persons 0 up to their number."""

    def __init__(
        self,
        groups: Sequence[Walkers],
        about: Sequence[AboutShare],
        site: Site,
        begins: float,
        errands: Errands,
        generator: np.random.Generator,
    ) -> None:
        """`begins` is the time of day at the beginning, seconds. ValueError on a place that is not there."""
        self._between = [places_of(group, site) for group in groups for _ in range(group.count)]
        self._about = about
        self._begins = begins
        self._errands = errands
        self._random = generator
        self._rank = [0.0] * len(self._between)
        """Who is about when only a share of all are: those of a rank below the share."""
        self._group_up(groups)

    def begin(self, robot: NDArray[np.float64]) -> None:
        """Put everybody who is about near a place and off the robot."""
        feet, random = self._errands.feet, self._random
        for one in range(len(self._between)):
            leader = int(feet.leader[one])
            place = self._draw(one) if leader == one else self._errands.at[leader]
            self._errands.begin_at(one, place)
            if leader == one:
                feet.wake[one] = random.uniform(0.0, STAY_MEAN_S)
            if self._is_wanted(one, 0.0):
                self._put(one, robot)

    def decide(self, one: int, now: float, robot: NDArray[np.float64]) -> None:
        """Somebody has got somewhere, or waited enough."""
        feet = self._errands.feet
        if feet.walks(one):
            if self._errands.carry_on(one, now, robot):
                self._stay(one, now)
        elif not self._is_wanted(one, now):
            self._go_home(one, now, robot)
        elif not feet.is_about(one):
            self._come_back(one, now, robot)
        else:
            self._set_off(one, now)

    def _group_up(self, groups: Sequence[Walkers]) -> None:
        feet, one = self._errands.feet, 0
        for group in groups:
            for number in range(group.count):
                first = number % group.together == 0
                leader = one if first else int(feet.leader[one - 1])
                if leader != one:
                    feet.join(one, leader)
                self._rank[one] = (number - number % group.together) / group.count
                one += 1

    def _is_wanted(self, one: int, now: float) -> bool:
        return self._rank[one] < share_at(self._about, (self._begins + now) % DAY_S)

    def _draw(self, one: int) -> int:
        between = self._between[one]
        return between[int(self._random.integers(len(between)))]

    def _put(self, one: int, robot: NDArray[np.float64]) -> None:
        """Stand near a place and off the robot; at whatever place was drawn last where that takes many tries."""
        errands = self._errands
        spot = errands.spot_off(errands.at[one], one, robot)
        for _ in range(PLACE_TRIES):
            if spot is not None:
                break
            errands.begin_at(one, self._draw(one))
            spot = errands.spot_off(errands.at[one], one, robot)
        if spot is not None:
            errands.feet.appear(one, spot)

    def _stay(self, one: int, now: float) -> None:
        """Stand for a while; who walks with somebody stands until that one sets off."""
        stay = 1.0 + self._random.exponential(STAY_MEAN_S)
        alone = self._errands.feet.leader[one] == one
        self._errands.feet.stand(one, now + stay if alone else math.inf)

    def _set_off(self, one: int, now: float) -> None:
        """Draw a place to go to and walk there with the group; where there is no way, stay a while longer."""
        errands = self._errands
        others = [place for place in self._between[one] if place != errands.at[one]]
        goal = others[int(self._random.integers(len(others)))] if others else None
        for member in self._members(one):
            if not errands.feet.is_about(member) or errands.feet.walks(member):
                continue
            if goal is None or not errands.send(member, goal, now):
                self._stay(member, now)

    def _go_home(self, one: int, now: float, robot: NDArray[np.float64]) -> None:
        """Leave the floor with the group; where the robot could see that, walk on to somewhere else first."""
        errands, feet = self._errands, self._errands.feet
        here = [member for member in self._members(one) if feet.is_about(member)]
        if any(not errands.unseen(feet.where(member), robot) for member in here):
            self._set_off(one, now)
            return
        for member in self._members(one):
            feet.vanish(member, self._again(now) if member == one else math.inf)

    def _come_back(self, one: int, now: float, robot: NDArray[np.float64]) -> None:
        """Step in at a place that the robot cannot see, or wait a while longer."""
        errands, feet = self._errands, self._errands.feet
        place = self._draw(one)
        if not errands.unseen(errands.ways.spots[place], robot):
            feet.wake[one] = self._again(now)
            return
        for member in self._members(one):
            if feet.is_about(member):
                continue
            spot = errands.spot_off(place, member, robot)
            if spot is not None:
                errands.begin_at(member, place)
                feet.appear(member, spot)
            self._stay(member, now)

    def _members(self, one: int) -> list[int]:
        feet = self._errands.feet
        return [member for member in range(len(self._between)) if feet.leader[member] == one]

    def _again(self, now: float) -> float:
        return now + float(self._random.uniform(0.5, 1.5)) * COME_BACK_S


def places_of(group: Walkers, site: Site) -> Sequence[int]:
    """Indices of the places that a group walks between. ValueError on a place that the site does not have."""
    names = [place.name for place in site.places]
    if missing := [name for name in group.between if name not in names]:
        raise ValueError(f'People are to walk between places that the site does not have: "{missing[0]}".')
    if not names:
        raise ValueError("People need places to walk between, and the site has none.")
    return [names.index(name) for name in group.between or names]
