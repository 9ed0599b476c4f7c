"""The robot's eyes: a planar lidar, cast against what is truly there, with what it gets wrong and what comes late.

What it gets wrong is worked out in `kernels.artefacts` and taken out again, as far as it can be, in `kernels.filters`.
"""

from __future__ import annotations

import math
from collections import deque
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from backends.sim.frames import Step, relative
from backends.sim.kernels.artefacts import mix, spoil
from backends.sim.kernels.filters import drop_body, drop_floor, drop_shadows, sight_of
from backends.sim.kernels.rays import scan
from backends.sim.outline import Outline
from runner.site.values import Filters, Lidar, Point, Pose, Post, RobotDescription

FULL_CIRCLE = 2.0 * math.pi - 1e-6
UNEVEN_OVER_M = 0.1
"""How far apart two spots of an uneven floor are whose heights have little to do with each other."""
NOD_ERROR = math.radians(0.1)
"""Standard deviation of what the robot's inertial sensor says of its nod."""
BODY_DEVIATIONS = 2.0
"""Deviations of the lidar's noise beyond its outline that the robot still takes for itself."""
NOWHERE = np.empty(0)


@dataclass(frozen=True, slots=True)
class Scan:
    """One scan in the robot frame: beam i points to `first` + i * `step`; infinity where nothing is believed.

    The arrays are reused by a later scan.
    """

    ranges: NDArray[np.float64]
    first: float
    step: float
    forward: float
    """How far ahead of the turning center it was taken, meters."""
    back: Step = (0.0, 0.0, 0.0)
    """Where the robot was when it was taken, seen from where it is now."""
    sight: NDArray[np.float64] = field(default_factory=lambda: NOWHERE)
    """How far each beam saw, infinite where nothing stopped it; negative where the robot itself is in its way, and then
    that of the beam beside it."""
    blind: bool = False
    """Nothing at all came back."""

    def origin(self, pose: Pose) -> tuple[float, float, float]:
        """Where the lidar was, and the direction of beam 0, with the robot now at a pose."""
        cosine, sine = math.cos(pose.heading), math.sin(pose.heading)
        ahead, left, turned = self.back
        ahead += self.forward * math.cos(turned)
        left += self.forward * math.sin(turned)
        return (
            pose.x + ahead * cosine - left * sine,
            pose.y + ahead * sine + left * cosine,
            pose.heading + turned + self.first,
        )


@dataclass(frozen=True, slots=True)
class _Taken:
    """A scan on its way: due at a tick, taken where odometry had the robot at a pose."""

    due: int
    odometry: Pose
    ranges: NDArray[np.float64]
    sight: NDArray[np.float64]
    blind: bool


class Scanner:
    """Takes scans, each `latency` ticks before it can be used."""

    def __init__(
        self,
        robot: RobotDescription,
        outline: Outline,
        uneven: float,
        ticks_per_s: int,
        noise: np.random.Generator,
        artefacts: np.random.Generator,
    ) -> None:
        """`uneven`: deviation of the floor's height, meters. `noise` is drawn for ranges, `artefacts` for the rest."""
        lidar = self._lidar = robot.lidar
        self._noise, self._artefacts = noise, artefacts
        self._eye = _Eye(robot, outline)
        self._filters = robot.filters
        self._nod = _Nod(uneven, outline, artefacts)
        self._delay = round(lidar.latency * ticks_per_s)
        self._under_way: deque[_Taken] = deque()
        self._raw = np.full(lidar.beams, np.inf)
        self._normal, self._even = np.zeros(lidar.beams), np.ones(lidar.beams)
        self._spare = [(np.full(lidar.beams, np.inf), np.full(lidar.beams, np.inf)) for _ in range(self._delay + 2)]
        self._next = 0

    def look(
        self,
        tick: int,
        pose: Pose,
        driven: float,
        odometry: Pose,
        sight: NDArray[np.float32],
        people: NDArray[np.float64],
        blind: bool,
    ) -> None:
        """Take a scan from the true pose.

        `driven` is the way made so far, `sight` the distance field of what stands at the height of the lidar, `people`
        rows of (x, y, radius); `blind` where nothing comes back.
        """
        nod = self._nod.at(driven)
        if blind:
            self._raw.fill(np.inf)
        else:
            self._cast(pose, nod, sight, people)
        ranges, seen = self._spare[self._next]
        self._next = (self._next + 1) % len(self._spare)
        self._filter(nod, ranges)
        returns = sight_of(self._raw, self._eye.body, seen)
        self._under_way.append(_Taken(tick + self._delay, odometry, ranges, seen, not returns))

    def deliver(self, tick: int, odometry: Pose) -> Scan | None:
        """The scan that can be used now, if there is one. `odometry` says where the robot is now."""
        if not self._under_way or self._under_way[0].due > tick:
            return None
        taken, eye = self._under_way.popleft(), self._eye
        back = (0.0, 0.0, 0.0) if not self._delay else relative(odometry, taken.odometry)
        return Scan(taken.ranges, eye.first, eye.step, self._lidar.forward, back, taken.sight, taken.blind)

    def _cast(self, pose: Pose, nod: float, sight: NDArray[np.float32], people: NDArray[np.float64]) -> None:
        lidar, eye, raw = self._lidar, self._eye, self._raw
        x = pose.x + lidar.forward * math.cos(pose.heading)
        y = pose.y + lidar.forward * math.sin(pose.heading)
        first = pose.heading + eye.first
        normal, even = self._normal, self._even
        self._noise.standard_normal(out=normal)
        scan(sight, people, x, y, first, eye.step, lidar.range_max, lidar.noise, normal, raw)
        if lidar.beam_width > 0.0 or lidar.dropouts > 0.0:
            self._artefacts.random(out=even)
        if lidar.beam_width > 0.0:
            mix(sight, people, x, y, first, eye.step, lidar.range_max, lidar.beam_width, even, raw)
        if eye.posts or nod != 0.0 or lidar.dropouts > 0.0:
            spoil(
                raw, eye.own, eye.ahead, lidar.range_max, lidar.noise, lidar.height, nod, lidar.dropouts, normal, even
            )

    def _filter(self, nod: float, ranges: NDArray[np.float64]) -> None:
        """Fill `ranges` with what of the raw ones is believed."""
        raw, eye, lidar = self._raw, self._eye, self._lidar
        np.copyto(ranges, raw)
        filters: Filters = self._filters
        if filters.own_body and eye.posts:
            drop_body(raw, eye.body, ranges)
        if filters.shadow_points and lidar.beam_width > 0.0:
            drop_shadows(raw, eye.body, eye.step, ranges)
        if filters.floor_returns and self._nod.deviation > 0.0 and lidar.height > 0.0:
            measured = nod + NOD_ERROR * self._artefacts.standard_normal()
            drop_floor(raw, eye.ahead, lidar.height, measured, ranges)


class _Eye:
    """The beams of one lidar on one robot: their angles, and what of the robot itself each of them meets."""

    def __init__(self, robot: RobotDescription, outline: Outline) -> None:
        lidar = robot.lidar
        gaps = lidar.beams if lidar.field_of_view >= FULL_CIRCLE else max(lidar.beams - 1, 1)
        self.first, self.step = -lidar.field_of_view / 2.0, lidar.field_of_view / gaps
        angles = self.first + np.arange(lidar.beams, dtype=np.float64) * self.step
        self.ahead = np.cos(angles)
        self.posts = bool(robot.posts)
        self.own = np.min([np.full(lidar.beams, np.inf), *(_seen(post, lidar, angles) for post in robot.posts)], axis=0)
        self.body = np.zeros(lidar.beams)
        if self.posts:
            self.body = _over(outline.hull, (lidar.forward, 0.0), angles) + BODY_DEVIATIONS * lidar.noise


class _Nod:
    """How far the robot's nose is down, radians: two wheels, a robot's length apart, on a floor of uneven height.

    A Gaussian process over the way driven: what the wheels stand on is forgotten over `UNEVEN_OVER_M`.
    """

    def __init__(self, uneven: float, outline: Outline, generator: np.random.Generator) -> None:
        length = float(np.ptp(outline.hull[:, 0]))
        self.deviation = math.sqrt(2.0) * uneven / length
        self._random = generator
        self._driven = 0.0
        self._now = 0.0

    def at(self, driven: float) -> float:
        """The nod after so many meters."""
        if self.deviation > 0.0 and driven != self._driven:
            keep = math.exp((self._driven - driven) / UNEVEN_OVER_M)
            drawn = float(self._random.standard_normal())
            self._now = keep * self._now + self.deviation * math.sqrt(1.0 - keep * keep) * drawn
            self._driven = driven
        return self._now


def _seen(post: Post, lidar: Lidar, angles: NDArray[np.float64]) -> NDArray[np.float64]:
    """Range of a round post in each beam, infinite where it is missed."""
    x, y, radius = post.at[0] - lidar.forward, post.at[1], 0.5 * post.thickness
    along = x * np.cos(angles) + y * np.sin(angles)
    across = x * np.sin(angles) - y * np.cos(angles)
    hit = (along > 0.0) & (np.abs(across) < radius)
    depth = np.sqrt(np.maximum(radius * radius - across * across, 0.0))
    return np.where(hit, np.maximum(along - depth, 0.0), np.inf)


def _over(hull: NDArray[np.float64], eye: Point, angles: NDArray[np.float64]) -> NDArray[np.float64]:
    """How far each beam runs over the convex outline until it leaves it; 0 where the lidar stands outside."""
    corners = hull - eye
    ahead, left = np.cos(angles), np.sin(angles)
    least = np.full(angles.shape, np.inf)
    for (x1, y1), (x2, y2) in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        side_x, side_y = x2 - x1, y2 - y1
        inside = x1 * side_y - y1 * side_x  # positive where the eye is on the inner side of this edge
        if inside < 0.0:
            return np.zeros(angles.shape)
        outward = ahead * side_y - left * side_x
        with np.errstate(divide="ignore"):
            least = np.where(outward > 1e-12, np.minimum(least, inside / outward), least)
    return least
