"""Poses seen from other poses."""

from __future__ import annotations

import math

from runner.site.values import Pose

Step = tuple[float, float, float]
"""A pose seen from another: ahead, to the left, turned."""


def relative(here: Pose, there: Pose) -> Step:
    """A pose as seen from another one."""
    cosine, sine = math.cos(here.heading), math.sin(here.heading)
    x, y = there.x - here.x, there.y - here.y
    return x * cosine + y * sine, y * cosine - x * sine, there.heading - here.heading


def seen_from(here: Pose, there: Step) -> Pose:
    """The pose of what is seen from `here` so far ahead, to the left, and turned: the way back from `relative`."""
    ahead, left, turned = there
    cosine, sine = math.cos(here.heading), math.sin(here.heading)
    return Pose(
        here.x + cosine * ahead - sine * left,
        here.y + sine * ahead + cosine * left,
        here.heading + turned,
    )
