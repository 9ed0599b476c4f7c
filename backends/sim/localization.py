"""Where the robot believes it is: Monte Carlo localization on the map, and odometry between two looks at it.

Fox, Burgard, Dellaert and Thrun, *Monte Carlo localization: efficient position estimation for mobile robots*, AAAI
1999, with adaptive sample size (Fox 2003). The arithmetic is in `kernels.particles`. The robot knows its map, its scans
and its odometry; where it truly is never comes in here.

It finds that it is lost by beams that run through walls of the map: people and cartons can only make beams shorter.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from backends.sim.frames import relative, seen_from
from backends.sim.kernels.particles import BINS, EMPTY, against_map, draw, ends_of, move, summary, weigh
from backends.sim.likelihood import Field, find_on
from backends.sim.odometry import Wheels
from backends.sim.sensing import Scan
from runner.site.values import Lidar, Pose

MOST = 4000
"""Poses at most, while it looks for itself."""
FEWEST = 60
"""Poses at least."""
ERROR, QUANTILE = 0.05, 2.326348
"""The spread over bins is known within this, with 99 % probability."""
BEAMS = 30
"""Compared with the map each time; others each time, so that all get their turn."""
TRUST = 0.4
"""What the beams are worth, as a share, of as many independent ones: what one misjudges its neighbors do too."""
BETWEEN_M, BETWEEN_TURN, BETWEEN_S = 0.2, math.radians(10.0), 1.0
"""Beams are compared with the map after so much driving, turning or, at rest, time."""
BLUR_M, BLUR_TURN = 0.006, math.radians(0.12)
"""Each pose drawn is moved a little at random (roughening: Gordon, Salmond and Smith, 1993)."""
GRAIN_M, GRAIN_TURN = 0.01, math.radians(0.15)
"""Deviation of what the map's cells leave open, and the poses therefore cannot tell."""
START_M, START_TURN = 0.05, math.radians(2.0)
NEAR_M, NEAR_TURN = 0.1, math.radians(4.0)
HINT_M, HINT_TURN = 0.5, math.radians(20.0)
"""Deviation of the start pose, of where it believes to be when told to look, and of where somebody says it is."""
LOST_SHARE, FOUND_SHARE = 0.3, 0.12
"""With more than this share of beams through walls it is lost; with less than that not any more."""
REMEMBERED = 0.6
"""How much of the share of the looks before is kept at each look."""
SEARCH_LOOKS = 16
"""Scans for which it looks for itself before it says what came of it."""
SEARCH_BLUR = 12.0
"""How much more than usual poses are blurred at the first of them."""
FOUND_M = 0.3
"""It has found itself where it knows its position better than this."""
MATCHING_SHARE = 0.4
"""And where at least so many beams end where the map has something."""


@dataclass(slots=True)
class _Search:
    """A look for itself under way, near `hint` where that is known; `then_anywhere` where it is not there."""

    hint: Pose | None
    then_anywhere: bool = False
    looks: int = 0


class Localization:
    """`pose`, and `covariance` (3, 3) of x, y and heading, meters and radians; `lost` where it knows that it is."""

    def __init__(self, field: Field, lidar: Lidar, wheels: Wheels, start: Pose, generator: np.random.Generator) -> None:
        self._field, self._lidar, self._wheels, self._random = field, lidar, wheels, generator
        self._poses, self._fresh = np.zeros((MOST, 3)), np.zeros((MOST, 3))
        self._weights, self._drawn = np.zeros(MOST), np.zeros((MOST, 4))
        self._ends, self._bins = np.zeros((BEAMS, 2)), np.full(BINS, EMPTY)
        self._every = max(1, lidar.beams // BEAMS)
        self._offset = 0
        self._through, self._matching = 0.0, 1.0
        self._search: _Search | None = None
        self._looked_at = wheels.pose
        self._looked_when = 0.0
        self._count = FEWEST
        self.covariance = np.zeros((3, 3))
        self.lost = False
        self.pose = self._at_look = start
        self._scatter(start, START_M, START_TURN, 2 * FEWEST)

    @property
    def spread(self) -> float:
        """Standard deviation of the believed position along the worse direction, meters."""
        if self.lost:
            return self._field.spread
        (a, b), (_, c) = self.covariance[:2, :2].tolist()
        return math.sqrt(0.5 * (a + c) + math.sqrt(0.25 * (a - c) * (a - c) + b * b))

    @property
    def count(self) -> int:
        """How many poses it is made of now."""
        return self._count

    @property
    def searching(self) -> bool:
        """Whether the robot looks for itself, for which it should stand."""
        return self._search is not None

    def predict(self) -> None:
        """Carry the belief on by what the wheels said since the last look at the map."""
        self.pose = seen_from(self._at_look, relative(self._looked_at, self._wheels.pose))

    def relocate(self, hint: Pose | None) -> None:
        """Begin to find out anew where it is: near a hint, or, where it does not take itself for lost, near where it
        believes to be and, if it is not there, anywhere. `correct` says what came of it."""
        self._search = _Search(self.pose, then_anywhere=True) if hint is None and not self.lost else _Search(hint)

    def give_up(self) -> bool:
        """End a search under way; whether there was one."""
        under_way, self._search = self._search is not None, None
        return under_way

    def correct(self, scan: Scan, now: float) -> str | None:
        """Compare a scan with the map where it is time to. What came of a search, where one ended: "" for found."""
        if scan.blind or not (self._search is not None or self._is_due(now)):
            return None
        self._carry_poses(now)
        ends = self._ends_of(scan)
        if not len(ends):
            return None
        if self._search is not None and self._search.looks == 0:
            self._begin_search(self._search, ends)
        self._draw_anew(ends)
        self._judge(scan, ends)
        return self._go_on_searching()

    # --- one look at the map ----------------------------------------------------------------------------------

    def _is_due(self, now: float) -> bool:
        ahead, left, turned = relative(self._looked_at, self._wheels.pose)
        return (
            ahead * ahead + left * left >= BETWEEN_M * BETWEEN_M
            or abs(turned) >= BETWEEN_TURN
            or now - self._looked_when >= BETWEEN_S
        )

    def _carry_poses(self, now: float) -> None:
        """Move all poses by what the wheels said since the last look, each with its own error."""
        motion, doubt = relative(self._looked_at, self._wheels.pose), self._wheels.ask()
        self._looked_at, self._looked_when = self._wheels.pose, now
        self._weights[: self._count] = 0.0
        if motion != (0.0, 0.0, 0.0):
            move(
                self._poses[: self._count], *motion, math.sqrt(doubt.way), math.sqrt(doubt.turn), math.sqrt(doubt.last),
                self._normal(self._count), self._weights[: self._count],
            )  # fmt: skip

    def _ends_of(self, scan: Scan) -> NDArray[np.float64]:
        """Where some of the beams ended, as seen from the robot."""
        self._offset = (self._offset + 1) % self._every
        x, y, first = scan.origin(Pose(0.0, 0.0, 0.0))
        filled = ends_of(
            scan.ranges, x, y, first, scan.step, self._offset, self._every, self._lidar.range_max, self._ends
        )
        return self._ends[:filled]

    def _draw_anew(self, ends: NDArray[np.float64]) -> None:
        """Draw poses by how well they fit the map."""
        poses, weights, search = self._poses[: self._count], self._weights[: self._count], self._search
        weigh(poses, ends, self._field.signed, self._field.table, TRUST, weights)
        wider = 1.0 if search is None else max(1.0, SEARCH_BLUR * (1.0 - 2.0 * search.looks / SEARCH_LOOKS))
        most = MOST if search is not None else min(self._count + FEWEST, MOST)
        self._count = draw(
            poses, weights, float(self._random.random()), FEWEST, ERROR, QUANTILE, wider * BLUR_M, wider * BLUR_TURN,
            self._normal(most), self._fresh[:most], self._bins,
        )  # fmt: skip
        self._poses, self._fresh = self._fresh, self._poses
        self._sum_up()

    def _sum_up(self) -> None:
        self._at_look = self.pose = Pose(*summary(self._poses[: self._count], self.covariance))
        self.covariance[0, 0] += GRAIN_M * GRAIN_M
        self.covariance[1, 1] += GRAIN_M * GRAIN_M
        self.covariance[2, 2] += GRAIN_TURN * GRAIN_TURN

    def _judge(self, scan: Scan, ends: NDArray[np.float64]) -> None:
        """Whether it is lost: do beams run through walls?"""
        eye_x, eye_y, _ = scan.origin(Pose(0.0, 0.0, 0.0))
        longer, matching = against_map(
            self._field.known, self.pose.x, self.pose.y, self.pose.heading, eye_x, eye_y, ends
        )
        looked_at = (len(ends) + 1) // 2
        share = longer / looked_at
        self._matching = matching / looked_at
        self._through = REMEMBERED * self._through + (1.0 - REMEMBERED) * share
        if self._search is not None:
            return
        self.lost = self._through > (FOUND_SHARE if self.lost else LOST_SHARE)
        if share > LOST_SHARE:
            self._looked_when = -math.inf  # look again at once

    # --- looking for itself -----------------------------------------------------------------------------------

    def _begin_search(self, search: _Search, ends: NDArray[np.float64]) -> None:
        if search.hint is not None:
            wide = (NEAR_M, NEAR_TURN) if search.then_anywhere else (HINT_M, HINT_TURN)
            self._scatter(search.hint, *wide, MOST)
            self._weights[:MOST] = 0.0
            return
        self._poses[:MOST] = find_on(self._field, ends, MOST, self._random)
        self._count = MOST
        self._weights[:MOST] = 0.0

    def _go_on_searching(self) -> str | None:
        search = self._search
        if search is None:
            return None
        search.looks += 1
        if search.looks < SEARCH_LOOKS:
            return None
        self._search, self.lost = None, False
        if search.then_anywhere:
            return self._settle_near()
        unsure = self.spread > FOUND_M
        if not unsure and self._through < FOUND_SHARE and self._matching >= MATCHING_SHARE:
            return ""
        self.lost, self._through = True, 1.0
        return "Several spots on the map look alike from here." if unsure else "The map shows no spot like this one."

    def _settle_near(self) -> str | None:
        """After a look near where it believed to be: beams through walls say that it is elsewhere, while beams that
        people and cartons stop say nothing."""
        if self._through >= FOUND_SHARE:
            self._search, self.lost = _Search(None), True
            return None
        return ""

    def _scatter(self, pose: Pose, deviation: float, turned: float, count: int) -> None:
        """Poses about one, normally distributed."""
        self._count = count
        self._poses[:count] = (pose.x, pose.y, pose.heading)
        self._poses[:count] += self._normal(count)[:, :3] * (deviation, deviation, turned)
        self._sum_up()
        self.pose = self._at_look = pose

    def _normal(self, count: int) -> NDArray[np.float64]:
        drawn = self._drawn[:count]
        self._random.standard_normal(out=drawn)
        return drawn
