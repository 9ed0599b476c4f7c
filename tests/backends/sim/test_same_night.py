"""The same seed gives the same night to the bit with everything going on, however time is cut up."""

from __future__ import annotations

import pytest

from backends.contract import GoalReport, Report, Truth
from runner.site.values import (
    AboutShare,
    Bystander,
    Carton,
    Clutter,
    Conditions,
    Crowd,
    DoorChange,
    Fault,
    FaultKind,
    Pose,
    Solid,
    Walkers,
)
from tests.backends.sim.support import TWO_ROOMS, go, start

EVERYTHING = Conditions(
    cartons=(Carton((4.5, 2.0), (0.4, 0.4), when_near=2.0, stays_s=20.0, low=True),),
    doors=(DoorChange("south door", 40.0, open=False), DoorChange("south door", 80.0, open=True)),
    walkers=(Walkers(4, together=2), Walkers(2, between=("west", "east"))),
    clutter=(Clutter(120.0, 60.0, low=0.5, moved=0.5),),
    extra=(Solid(((9.0, 4.0), (9.5, 4.0), (9.5, 4.5), (9.0, 4.5))),),
    bystanders=(Bystander((7.0, 2.1), 20.0, 50.0), Bystander((10.0, 2.0), when_near=2.0, stays_s=10.0)),
    crowds=(Crowd(4, 20.0, at_s=60.0), Crowd(2, 10.0, per_hour=60.0)),
    about=(AboutShare(18.0 * 3600.0 + 100.0, 18.0 * 3600.0 + 160.0, 0.3),),
    doors_shut_by_people=0.5,
    faults=(
        Fault(FaultKind.WHEELS_STUCK, 3.0, per_hour=100.0),
        Fault(FaultKind.SLIP, 3.0, per_hour=100.0, slip=0.3),
        Fault(FaultKind.LIDAR_BLIND, 3.0, per_hour=100.0),
        Fault(FaultKind.EMERGENCY_STOP, 5.0, at_s=70.0),
        Fault(FaultKind.SILENT, 7.0, per_hour=60.0),
        Fault(FaultKind.CARRIED, at_s=120.0, to=Pose(12.0, 7.0, 0.0)),
    ),
)
NIGHT_S = 200


def night(seed: int, cuts: list[float]) -> tuple[list[Report], list[Truth], list[float]]:
    """Reports and truths of a night in which goals are sent every twenty seconds."""
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, conditions=EVERYTHING)
    simulator = drive.simulator
    turn = 0
    for number in range(1, NIGHT_S // 20 + 1):
        go(drive, number, TWO_ROOMS.places[number % 4].pose)
        while simulator.clock.now() < 20.0 * number:
            drive.reports += simulator.reports(min(20.0 * number, simulator.clock.now() + cuts[turn % len(cuts)]))
            turn += 1
    people = [float(value) for row in simulator.people.bodies for value in row]
    return drive.reports, list(simulator.truths()), people


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_how_time_is_cut_up_changes_nothing_with_everything_going_on(seed: int) -> None:
    whole, sliced = night(seed, [20.0]), night(seed, [0.05, 0.37, 3.0, 0.1])
    assert repr(whole) == repr(sliced)
    reports, truths, _ = whole
    assert any(isinstance(report, GoalReport) for report in reports)
    assert len({truth.cause for truth in truths}) >= 4


def test_another_seed_is_another_night() -> None:
    assert repr(night(1, [20.0])) != repr(night(2, [20.0]))
