"""The footprint along a route and through a lattice, against brute force with whole polygons (shapely)."""

from __future__ import annotations

import math
from random import Random

import numpy as np
import pytest

from runner.site.floor import cell_of, footprint_free
from runner.site.lattice import HEADINGS, reach
from runner.site.sweep import poses_along, sweep
from runner.site.ways import plan_ways
from tests.site.passages import (
    random_passage,
    reached_by_force,
    solid_cells,
    swept_by_force,
)

FEW, MANY = range(40), range(500)


def compare_route(number: int) -> str:
    """Plan as a robot does, drive the footprint along, and let brute force do the same; how it went."""
    passage = random_passage(Random(number))  # noqa: S311  a seed, not a secret
    ends = ((passage.start.x, passage.start.y), (passage.goal.x, passage.goal.y))
    way = plan_ways(passage.clearance, passage.footprint, [ends])[ends]
    if not way.exists:
        return "no way for a disc"
    poses = [passage.start, *poses_along(way.points), passage.goal]
    hit = sweep(passage.blocked, passage.clearance, passage.footprint, poses)
    forced = swept_by_force(solid_cells(passage.blocked), passage.footprint, poses)
    assert (hit is None) == (forced is None), number
    if hit is not None and forced is not None:
        assert hit.pose == poses[forced], number
    return "free" if hit is None else "pinched"


def compare_reach(number: int) -> str:
    """Whatever can be come to by the lattice can be by brute force, and the other way round, but for touches."""
    passage = random_passage(Random(number))  # noqa: S311  a seed, not a secret
    if not footprint_free(passage.blocked, passage.footprint, passage.start):
        return "no start"
    forced = reached_by_force(passage)
    found = reach(passage.blocked, passage.clearance, passage.footprint, passage.start).headings
    ours = {
        (row, column, heading)
        for row, column in np.argwhere(found)
        for heading in range(HEADINGS)
        if int(found[row, column]) >> heading & 1
    }
    assert ours <= forced, (number, len(ours - forced))
    heading = round(passage.goal.heading / (2 * math.pi / HEADINGS)) % HEADINGS
    goal = (*cell_of((passage.goal.x, passage.goal.y)), heading)
    assert (goal in ours) == (goal in forced), number
    assert len(ours) >= 0.97 * len(forced), (number, len(ours), len(forced))
    return "goal reached" if goal in ours else "goal not reached"


def test_a_route_pinches_for_the_sweep_where_it_pinches_for_whole_polygons() -> None:
    seen = [compare_route(number) for number in FEW]
    assert {"free", "pinched"} <= set(seen)


def test_the_lattice_gets_to_what_whole_polygons_get_to() -> None:
    assert compare_reach(0) == "goal reached"


@pytest.mark.soak
def test_a_route_pinches_where_it_pinches_for_polygons_on_500_doorways_and_corners() -> None:
    seen = [compare_route(number) for number in MANY]
    assert min(seen.count("free"), seen.count("pinched")) > 50


@pytest.mark.soak
def test_the_lattice_gets_to_what_polygons_get_to_on_500_doorways_and_corners() -> None:
    seen = [compare_reach(number) for number in MANY]
    assert min(seen.count("goal reached"), seen.count("goal not reached")) > 50
