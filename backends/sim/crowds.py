"""Crowds: people who come from the places around, gather round the robot, and after a while walk off again.

They stand on a ring around the robot, evenly, the first in front of it; where a wall is in the way, as near as they
come. When the robot moves on while they are there, they come after it.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from backends.sim.errands import Errands
from backends.sim.outline import Outline
from runner.site.values import Crowd, Point

RING_M = 0.15
"""Between the robot's circumscribed circle and the people who stand around it."""
BESIDE_M = 0.6
"""Whoever goes to the far side keeps so much farther from the robot."""
NEAR_M = 0.8
"""Somebody this much farther from the robot than the ring comes after it."""
FROM_M = 4.0
"""They come from the nearest places that are at least so far from the robot."""
FROM_PLACES = 3
STUCK_LOOKS_EVERY_S = 3
AT_MOST_ON_THE_WAY_S = 60.0
"""A crowd of which nobody got to the robot by then gives up."""


@dataclass(slots=True)
class _Gathering:
    """One crowd: who belongs to it, when it comes next, and, while it is there, when it leaves."""

    crowd: Crowd
    members: range
    due: float
    leaves: float = math.inf
    met: bool = False
    here: bool = False
    turned: float = 0.0
    """Where the first spot of the ring is, radians."""
    slots: dict[int, int] = field(default_factory=dict)
    """The spot of the ring that each member has, counted counterclockwise."""
    aims: dict[int, Point] = field(default_factory=dict)
    """Where the robot was when each member last made for it."""


class Crowds:
    """All crowds of the conditions: persons `first` and on."""

    def __init__(self, crowds: Sequence[Crowd], first: int, errands: Errands, generator: np.random.Generator) -> None:
        self._errands = errands
        self._random = generator
        self._gatherings: list[_Gathering] = []
        for crowd in crowds:
            due = self._gap(crowd) if crowd.at_s is None else crowd.at_s
            self._gatherings.append(_Gathering(crowd, range(first, first + crowd.count), due))
            first += crowd.count

    def advance(self, now: float, robot: NDArray[np.float64], outline: Outline) -> None:
        """Let crowds come and leave. Once a second is enough."""
        for one in self._gatherings:
            if not one.here and now >= one.due and not any(map(self._errands.feet.is_about, one.members)):
                self._come(one, now, robot, outline)
            elif one.here and now >= one.leaves:
                self._leave(one, now, robot)
            elif one.here:
                self._keep_near(one, now, robot, outline)

    def decide(self, one: int, now: float, robot: NDArray[np.float64]) -> None:
        """Somebody got to a bend, to the robot, or off again."""
        feet = self._errands.feet
        gathering = next(each for each in self._gatherings if one in each.members)
        if gathering.here:
            if not feet.walks(one) or now >= feet.wake[one] or not feet.next_bend(one, now):
                feet.stand(one, math.inf)
        elif feet.walks(one):
            if self._errands.carry_on(one, now, robot):
                feet.stand(one, now)
        else:
            self._errands.leave_floor(one, now, robot)

    def _gap(self, crowd: Crowd) -> float:
        return float(self._random.exponential(3600.0 / crowd.per_hour)) if crowd.per_hour else math.inf

    def _come(self, one: _Gathering, now: float, robot: NDArray[np.float64], outline: Outline) -> None:
        one.due = math.inf if one.crowd.per_hour is None else now + self._gap(one.crowd)
        one.here, one.met, one.leaves = True, False, now + AT_MOST_ON_THE_WAY_S
        one.turned = float(robot[2])
        one.slots.clear()
        places = self._places_around(robot)
        for number, member in enumerate(one.members):
            place = places[number % len(places)]
            self._errands.begin_at(member, place)
            spot = self._errands.spot_off(place, member, robot)
            if spot is not None:
                self._errands.feet.appear(member, spot)
                self._approach(one, member, now, robot, outline)

    def _places_around(self, robot: NDArray[np.float64]) -> list[int]:
        """The nearest places that are not too near; all where there are none such."""
        off = [(math.hypot(x - robot[0], y - robot[1]), place) for place, (x, y) in enumerate(self._errands.ways.spots)]
        far = sorted(one for one in off if one[0] >= FROM_M) or sorted(off)
        return [place for _, place in far[:FROM_PLACES]]

    def _keep_near(self, one: _Gathering, now: float, robot: NDArray[np.float64], outline: Outline) -> None:
        feet = self._errands.feet
        for member in filter(feet.is_about, one.members):
            x, y = feet.where(member)
            away = math.hypot(x - robot[0], y - robot[1]) - self._ring(member, outline)
            if away < NEAR_M and not one.met:
                one.met, one.leaves = True, now + one.crowd.stays_s
            if away > NEAR_M and self._looks_again(one, member, now, robot):
                self._approach(one, member, now, robot, outline)

    def _looks_again(self, one: _Gathering, member: int, now: float, robot: NDArray[np.float64]) -> bool:
        """Whether somebody who is not there yet, or not any more, makes for the robot anew."""
        aim = one.aims[member]
        if self._errands.feet.walks(member):
            return math.hypot(robot[0] - aim[0], robot[1] - aim[1]) > NEAR_M
        return (round(now) + member) % STUCK_LOOKS_EVERY_S == 0

    def _ring(self, member: int, outline: Outline) -> float:
        return outline.outer + RING_M + float(self._errands.feet.bodies[member, 2])

    def _approach(self, one: _Gathering, member: int, now: float, robot: NDArray[np.float64], outline: Outline) -> None:
        """Walk to the nearest spot on the ring that nobody else has, going round the robot to the far side."""
        feet, ways = self._errands.feet, self._errands.ways
        here, radius = feet.where(member), float(feet.bodies[member, 2])
        robot_at = one.aims[member] = (float(robot[0]), float(robot[1]))
        ring = self._ring(member, outline)
        spot = self._free_spot(one, member, here, robot_at, ring)
        way = ways.straight_or_round(here, spot, radius)
        if way is None:
            feet.stand(member, math.inf)
            return
        before = here if len(way) == 1 else (float(way[-2, 0]), float(way[-2, 1]))
        feet.walk(member, np.vstack([way[:-1], *_round(before, spot, robot_at, ring), way[-1:]]), now)

    def _free_spot(self, one: _Gathering, member: int, here: Point, robot_at: Point, ring: float) -> Point:
        """The nearest spot of the ring that is free; the robot itself where none is, which is as near as one comes."""
        count, ways = one.crowd.count, self._errands.ways
        spots = {}
        for slot in set(range(count)) - {other for who, other in one.slots.items() if who != member}:
            angle = one.turned + 2.0 * math.pi * slot / count
            spot = (robot_at[0] + ring * math.cos(angle), robot_at[1] + ring * math.sin(angle))
            if ways.sees(robot_at, spot, 2.0 * ring):
                spots[slot] = spot
        if not spots:
            return robot_at
        slot = min(spots, key=lambda slot: (math.dist(spots[slot], here), slot))
        one.slots[member] = slot
        return spots[slot]

    def _leave(self, one: _Gathering, now: float, robot: NDArray[np.float64]) -> None:
        one.here = False
        for member in one.members:
            if self._errands.feet.is_about(member):
                self._errands.send_off(member, robot, now)


def _round(start: Point, end: Point, middle: Point, ring: float) -> list[Point]:
    """A point beside the robot by which to go, where the straight line would lead through the ring around it."""
    along_x, along_y = end[0] - start[0], end[1] - start[1]
    length = math.hypot(along_x, along_y)
    if length < ring:
        return []
    along_x, along_y = along_x / length, along_y / length
    to_x, to_y = middle[0] - start[0], middle[1] - start[1]
    ahead, left = to_x * along_x + to_y * along_y, along_x * to_y - along_y * to_x
    if not 0.0 < ahead < length or abs(left) > ring:
        return []
    side = 1.0 if left < 0.0 else -1.0
    off = side * (ring + BESIDE_M)
    return [(middle[0] - along_y * off, middle[1] + along_x * off)]
