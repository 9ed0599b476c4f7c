"""What goes wrong with the robot, and what it then does. Each on three seeds."""

from __future__ import annotations

import math
from datetime import datetime
from pathlib import Path

import pytest

from backends.contract import Cause, GoalReport, GoalStatus, Report, Setup, Telemetry
from backends.sim.simulator import Simulator
from backends.sim.trouble import Trouble
from runner.engine.state import initial_state
from runner.host.board import Board
from runner.host.distress import Distress, RunError
from runner.host.hooks import Teller
from runner.host.host import Host
from runner.host.plan import Care
from runner.journal.reader import open_record
from runner.journal.writer import JournalWriter
from runner.machine.codec import to_json
from runner.machine.compiler import compile_mission
from runner.site.values import Conditions, Fault, FaultKind, Pose
from tests import builders
from tests.backends.sim.scenarios.watching import SEEDS
from tests.backends.sim.support import HALL, TWO_ROOMS, Drive, distance, go, start
from tests.journal.records import header

ARRIVED = GoalStatus.ARRIVED
WEST, EAST = Pose(2.0, 4.0, 0.0), Pose(10.0, 4.0, 0.0)


def with_fault(kind: FaultKind, for_s: float, at_s: float, seed: int = 1, slip: float = 0.0) -> Drive:
    """A robot in a hall, on its way from west to east, to which something happens."""
    fault = Fault(kind, for_s, at_s=at_s, slip=slip)
    drive = start(HALL, WEST, seed=seed, conditions=Conditions(faults=(fault,)))
    go(drive, 1, EAST)
    return drive


def moved(drive: Drive, begins: float, ends: float) -> float:
    """Meters made between two times."""
    drive.until(begins)
    before = drive.simulator.body.pose
    drive.until(ends)
    return distance(before, drive.simulator.body.pose)


def causes(drive: Drive, begins: float, ends: float) -> set[Cause]:
    return {truth.cause for truth in drive.simulator.truths() if begins <= truth.stamp <= ends}


@pytest.mark.parametrize("seed", SEEDS)
@pytest.mark.parametrize(
    ("kind", "cause"),
    [(FaultKind.EMERGENCY_STOP, Cause.STOPPED), (FaultKind.WHEELS_STUCK, Cause.WHEELS_STUCK)],
)
def test_an_emergency_stop_and_wheels_that_stick_hold_the_robot_for_their_time_and_it_goes_on(
    seed: int, kind: FaultKind, cause: Cause
) -> None:
    drive = with_fault(kind, 10.0, 5.0, seed)
    assert moved(drive, 3.0, 5.0) > 0.7
    assert moved(drive, 7.0, 15.0) < 0.01
    assert moved(drive, 15.2, 18.0) > 0.5
    end = drive.until_end(60.0)
    assert end is not None
    assert end.status is ARRIVED
    assert causes(drive, 6.0, 14.0) == {cause}


@pytest.mark.parametrize("seed", SEEDS)
def test_while_the_wheels_slip_the_robot_makes_less_way_than_they_turn(seed: int) -> None:
    drive = with_fault(FaultKind.SLIP, 3.0, 5.0, seed, slip=0.5)
    drive.until(5.0)
    assert 0.2 < moved(drive, 6.0, 8.0) < 1.1
    assert Cause.SLIP in causes(drive, 5.0, 8.0)


@pytest.mark.parametrize("seed", SEEDS)
def test_a_blind_lidar_sees_nothing_and_then_sees_again(seed: int) -> None:
    drive = with_fault(FaultKind.LIDAR_BLIND, 10.0, 5.0, seed)
    drive.until(12.0)
    assert drive.simulator.trouble.lidar_blind
    assert Cause.BLIND in causes(drive, 5.0, 12.0)
    end = drive.until_end(90.0)
    assert end is not None
    assert end.status is ARRIVED


@pytest.mark.parametrize("seed", SEEDS)
def test_a_silent_robot_drives_on_and_tells_its_end_when_it_is_heard_again(seed: int) -> None:
    drive = with_fault(FaultKind.SILENT, 60.0, 5.0, seed)
    drive.until(64.0)
    stamps = [report.stamp for report in drive.reports]
    assert max(stamps) <= 5.0
    assert distance(drive.simulator.body.pose, EAST) < 0.3
    drive.until(66.0)
    late: list[Report] = drive.reports[len(stamps) :]
    assert isinstance(late[0], GoalReport)
    assert (late[0].status, late[0].stamp) == (ARRIVED, 65.0)
    assert [report.stamp for report in drive.reports] == sorted(report.stamp for report in drive.reports)
    assert any(isinstance(report, Telemetry) for report in late)


@pytest.mark.parametrize("seed", SEEDS)
def test_the_host_notices_a_silent_robot_and_holds_the_mission(tmp_path: Path, seed: int) -> None:
    mission = builders.mission(builders.wait(5.0), builders.go(builders.FAR), builders.wait(120.0))
    machine = compile_mission(mission)
    silent = Conditions(faults=(Fault(FaultKind.SILENT, 90.0, at_s=12.0),))
    backend = Simulator(Setup(mission.site, mission.robot, mission.start.pose, silent, seed, datetime(2026, 1, 5, 18)))
    distress = Distress(tmp_path / "run", "a night", Care(patience=0.0), Teller(tmp_path))
    with JournalWriter.create(tmp_path / "run", header("run"), (), to_json(machine)) as journal:
        host = Host(machine, initial_state(machine), backend, journal, Board("x"), distress)
        with pytest.raises(RunError, match="Nothing has been heard from the robot for 3"):
            host.run()
    with open_record(tmp_path / "run") as record:
        (trouble,) = [entry for entry in record.entries() if entry.name == "trouble"]
        assert 12.0 + 30.0 <= trouble.stamp <= 12.0 + 33.0


@pytest.mark.parametrize("seed", SEEDS)
def test_a_carried_robot_is_really_elsewhere_and_the_truth_says_so(seed: int) -> None:
    fault = Fault(FaultKind.CARRIED, at_s=2.0, to=Pose(12.0, 7.0, math.pi))
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, conditions=Conditions(faults=(fault,)))
    drive.until(3.0)
    assert distance(drive.simulator.body.pose, Pose(12.0, 7.0, math.pi)) < 0.1
    assert distance(drive.telemetry()[-1].pose, Pose(2.0, 2.0, 0.0)) < 1.5, "it has not noticed"
    assert causes(drive, 2.0, 3.0) == {Cause.CARRIED}


@pytest.mark.parametrize("seed", SEEDS)
def test_a_robot_carried_to_anywhere_stands_free_there(seed: int) -> None:
    fault = Fault(FaultKind.CARRIED, per_hour=600.0)
    drive = start(TWO_ROOMS, Pose(2.0, 2.0, 0.0), seed=seed, conditions=Conditions(faults=(fault,)))
    spots = set()
    for second in range(1, 120):
        drive.until(float(second))
        pose = drive.simulator.body.pose
        spots.add((round(pose.x, 1), round(pose.y, 1)))
        assert 0.3 < pose.x < 13.7
        assert 0.3 < pose.y < 8.7
    assert 6 <= len(spots) <= 40  # twenty in two minutes on average


@pytest.mark.parametrize("seed", SEEDS)
def test_faults_by_rate_come_as_often_as_they_are_said_to(seed: int) -> None:
    fault = Fault(FaultKind.LIDAR_BLIND, 1.0, per_hour=60.0)
    drive = start(HALL, WEST, seed=seed, conditions=Conditions(faults=(fault,)))
    begun, before = 0, False
    for tick in range(1, 3600 * 2):
        drive.until(tick / 2.0)
        begun += drive.simulator.trouble.lidar_blind and not before
        before = drive.simulator.trouble.lidar_blind
    assert 35 <= begun <= 85  # 60 on average, deviation 8


def test_every_fault_begins_and_ends_and_leaves_nothing_behind() -> None:
    kinds = [kind for kind in FaultKind if kind is not FaultKind.CARRIED]
    faults = tuple(Fault(kind, 5.0, at_s=10.0 * number, slip=0.3) for number, kind in enumerate(kinds, 1))
    drive = start(HALL, WEST, conditions=Conditions(faults=faults))
    for number, kind in enumerate(kinds, 1):
        drive.until(10.0 * number + 2.0)
        assert drive.simulator.trouble != Trouble(), kind
        drive.until(10.0 * number + 6.0)
        assert drive.simulator.trouble == Trouble(), kind


def test_two_faults_of_a_kind_last_until_the_later_end() -> None:
    faults = (Fault(FaultKind.WHEELS_STUCK, 10.0, at_s=1.0), Fault(FaultKind.WHEELS_STUCK, 3.0, at_s=2.0))
    drive = start(HALL, WEST, conditions=Conditions(faults=faults))
    drive.until(10.9)
    assert drive.simulator.trouble.wheels_stuck
    drive.until(11.2)
    assert not drive.simulator.trouble.wheels_stuck
