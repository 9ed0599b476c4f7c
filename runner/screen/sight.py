"""Which part of the floor is looked at: the whole of it, or a part from closer, still or going along with the robot."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from runner.screen.floor_dots import Scale, fit
from runner.site.values import Point, Site

_STEP = 1.6
"""How much closer one step brings."""
_CLOSEST = 40.0
"""Dots a meter. Closer, a corridor is wider than a screen."""
_CALM = 0.3
"""The share of the picture on each side of its middle in which the robot moves before the picture does."""
ARROWS = {"left": (-1, 0), "right": (1, 0), "up": (0, 1), "down": (0, -1)}
_PAN = 0.25
"""The share of the picture that one key moves it by."""


@dataclass(frozen=True, slots=True)
class Sight:
    """`level` 0 is the whole floor. `center` is the point in the middle, None for the middle of the site."""

    level: int = 0
    center: Point | None = None
    follows: bool = True


def scale_of(sight: Sight, site: Site, columns: int, rows: int) -> Scale:
    """Where the site's points fall in a panel of that many cells."""
    whole = fit(site, columns, rows)
    if sight.level == 0 or whole.dots_per_meter <= 0.0:
        return whole
    dots = _dots_at(sight.level, whole)
    x, y = _kept_inside(sight.center or (site.width / 2, site.height / 2), site, columns / dots, rows * 2 / dots)
    return Scale(columns, rows, dots, columns - x * dots, rows * 2 - (site.height - y) * dots, site.height)


def _dots_at(level: int, whole: Scale) -> float:
    return max(min(whole.dots_per_meter * _STEP**level, _CLOSEST), whole.dots_per_meter)


def _kept_inside(center: Point, site: Site, half_width: float, half_height: float) -> Point:
    """The center moved so that no more of the picture than need be lies beyond the site."""
    return _between(center[0], half_width, site.width), _between(center[1], half_height, site.height)


def _between(value: float, half: float, size: float) -> float:
    return size / 2 if 2 * half >= size else min(max(value, half), size - half)


def closer(sight: Sight, scale: Scale, at: Point | None) -> Sight:
    """One step closer to a point, or to the middle."""
    if scale.dots_per_meter >= _CLOSEST:
        return sight
    return replace(sight, level=sight.level + 1, center=at or middle(scale))


def wider(sight: Sight, scale: Scale) -> Sight:
    """One step back."""
    return replace(sight, level=max(sight.level - 1, 0), center=middle(scale))


def moved(sight: Sight, scale: Scale, across: int, up: int) -> Sight:
    """Moved by keys, `across` and `up` counting them; it stays there. The whole floor does not move."""
    if sight.level == 0:
        return sight
    x, y = middle(scale)
    step = _PAN / scale.dots_per_meter
    return Sight(sight.level, (x + across * step * scale.columns * 2, y + up * step * scale.rows * 4), False)


def going_along(sight: Sight, scale: Scale, robot: Point | None) -> Sight:
    """The same, or centered anew where it follows a robot that has left the middle of the picture."""
    if not sight.follows or sight.level == 0 or robot is None:
        return sight
    row, column = scale.dot(robot)
    calm = abs(column / (scale.columns * 2) - 0.5) <= _CALM and abs(row / (scale.rows * 4) - 0.5) <= _CALM
    return sight if calm else replace(sight, center=robot)


def middle(scale: Scale) -> Point:
    """The point in the middle of the picture."""
    dots = scale.dots_per_meter
    if dots <= 0.0:
        return 0.0, scale.height / 2
    return (scale.columns - scale.left) / dots, scale.height - (scale.rows * 2 - scale.top) / dots


def point_at(scale: Scale, column: int, row: int) -> Point:
    """The point of the site under a cell."""
    x, y = middle(scale)
    dots = max(scale.dots_per_meter, math.ulp(1.0))
    return x + (column * 2 + 1 - scale.columns) / dots, y - (row * 4 + 2 - scale.rows * 2) / dots
