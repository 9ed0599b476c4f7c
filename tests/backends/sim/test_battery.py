"""The battery: full power up to a fraction, then less and less; what is drawn is missing; what is empty stands."""

from __future__ import annotations

from dataclasses import replace

import pytest

from backends.contract import GoalStatus
from backends.sim.battery import Charge
from runner.site.charging import charging_seconds
from runner.site.values import Battery, Conditions, Pose
from tests.backends.sim.support import CART, HALL, go, start

BATTERY = Battery(capacity=100.0, idle=10.0, driving=50.0, charging=200.0)


def charged_after(minutes: float, start_at: float) -> float:
    charge = Charge(BATTERY, BATTERY.capacity * start_at, charging=True)
    for _ in range(round(minutes * 600)):
        charge.spend(False, 0.1)
    return charge.fraction


def test_it_takes_the_whole_power_up_to_four_fifths() -> None:
    assert charged_after(15.0, 0.2) == pytest.approx(0.7)


def test_from_there_on_what_is_missing_decays_exponentially() -> None:
    """At constant voltage the current falls with what is missing: 1 - f = 0.2 exp(-P t / (C 0.2))."""
    assert 1.0 - charged_after(6.0, 0.8) == pytest.approx(0.2 * 2.718281828 ** (-200.0 * 0.1 / (100.0 * 0.2)), rel=1e-3)


def test_the_last_hundredth_is_charged_at_a_small_power_and_then_it_is_full() -> None:
    assert charged_after(60.0, 0.9) == 1.0


@pytest.mark.parametrize(("low", "high"), [(0.1, 0.7), (0.5, 0.95), (0.85, 0.97), (0.3, 1.0), (0.9, 0.2)])
def test_the_time_to_charge_is_what_the_simulator_takes(low: float, high: float) -> None:
    charge = Charge(BATTERY, BATTERY.capacity * low, charging=True)
    seconds = 0.0
    while charge.fraction < high:
        charge.spend(False, 0.1)
        seconds += 0.1
    assert charging_seconds(BATTERY, low, high) == pytest.approx(seconds, rel=2e-3, abs=0.2)


def test_it_charges_at_a_place_and_nowhere_else() -> None:
    half = Conditions(battery=0.5)
    for pose, rises in ((Pose(2.1, 4.2, 0.0), True), (Pose(6.0, 4.0, 0.0), False)):
        drive = start(HALL, pose, conditions=half)
        drive.simulator.charge()
        drive.until(120.0)
        assert (drive.telemetry()[-1].battery > 0.5) is rises


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_an_empty_battery_stops_the_robot_on_its_way_and_fails_the_goal(seed: int) -> None:
    small = replace(CART, battery=Battery(1.0, 20.0, 600.0, 200.0))
    drive = start(HALL, Pose(2.0, 4.0, 0.0), seed=seed, robot=small)
    go(drive, 1, Pose(10.0, 4.0, 0.0))
    end = drive.until_end(60.0)
    assert end is not None
    assert (end.status, end.reason) == (GoalStatus.FAILED, "The battery is empty.")
    assert 2.5 < drive.simulator.body.pose.x < 9.5
    go(drive, 2, Pose(2.0, 4.0, 0.0))
    assert drive.until_end(61.0).status is GoalStatus.REFUSED  # type: ignore[union-attr]
