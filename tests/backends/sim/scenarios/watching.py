"""Driving a scenario tick by tick, with an eye on what really happens."""

from __future__ import annotations

from dataclasses import dataclass

from backends.contract import GoalStatus, Telemetry
from backends.sim.body import SOLID
from runner.site.values import Pose
from tests.backends.sim.support import Drive, go

TICK_S = 0.1
SEEDS = (1, 2, 3)


@dataclass
class Leg:
    """One drive to a goal: how it ended (None: not in time), how long it took, and what was seen on the way."""

    end: GoalStatus | None
    seconds: float
    standing: float
    """Seconds in which neither wheel turned."""
    contacts: int
    """Ticks in which something solid stopped the robot."""
    fastest: float


def drive_leg(drive: Drive, number: int, pose: Pose, within: float, speed: float = 0.8) -> Leg:
    """Send a goal and watch until it ends."""
    go(drive, number, pose, speed)
    simulator = drive.simulator
    begun = simulator.clock.now()
    leg = Leg(None, 0.0, 0.0, 0, 0.0)
    while leg.end is None and leg.seconds < within:
        leg.seconds = round(leg.seconds + TICK_S, 1)
        end = drive.until_end(round(begun + leg.seconds, 1))
        leg.end = None if end is None else end.status
        body = simulator.body
        leg.standing += TICK_S * body.drive.still
        leg.contacts += body.met == SOLID
        leg.fastest = max(leg.fastest, body.drive.speed)
    return leg


def routes(drive: Drive) -> int:
    """How many routes the robot has planned."""
    return [one.route_number for one in drive.reports if isinstance(one, Telemetry)][-1]
