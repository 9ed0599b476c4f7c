"""The simulator as a backend: a fixed tick of virtual time, world first, then people, then the robot.

A tick depends only on the state before it and on the commands given since, never on how `reports` was called.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from datetime import datetime, timedelta

import numpy as np
from numpy.typing import NDArray

from backends.contract import Capability, Clock, Goal, Report, Setup, Telemetry, Truth
from backends.sim.body import Body
from backends.sim.carrying import spot_for
from backends.sim.faults import Faults
from backends.sim.likelihood import field_of
from backends.sim.localization import Localization
from backends.sim.memory import Memory, surveyed
from backends.sim.people import People
from backends.sim.robot import Robot
from backends.sim.sensing import Scanner
from backends.sim.sweep import Sweeper
from backends.sim.trouble import Trouble
from backends.sim.truth import BETWEEN_LOOKS_TICKS, Witness
from backends.sim.world import World
from runner.site.floor import rasterize
from runner.site.values import Pose

PREPARATION = "Compiling the simulator, once after an installation: some twenty seconds."

TICKS_PER_S = 10
TICK_S = 1.0 / TICKS_PER_S
TELEMETRY_S, TELEMETRY_IDLE_S = 0.25, 1.0
"""Time between two telemetry reports, at least: with something to do, and without."""
IDLE_TICKS_PER_LOOK = 5
"""With nothing to do the robot looks around only every so many ticks."""
CHARGER_REACH_M = 0.5
"""A charger is taken to stand at every place of the site; so near to one the robot charges."""
STREAMS = 10
"""Streams of random numbers: people, lidar, localization, artefacts of sensing, sweep, odometry, faults, doors that
people shut, clutter, where the robot is carried. New ones are added at the end, so that the others stay as they are."""
ROUTE_POINTS = 64
"""Points of the route in telemetry, at most."""


class VirtualClock:
    """Time that jumps as the arithmetic allows."""

    def __init__(self, begins: datetime) -> None:
        self._begins = begins
        self.seconds = 0.0

    @property
    def virtual(self) -> bool:
        return True

    def now(self) -> float:
        return self.seconds

    def wall(self) -> datetime:
        return self._begins + timedelta(seconds=self.seconds)


class Simulator:
    """One robot on one floor. `world`, `people` and `body` are the truth, for tests and measurements only."""

    def __init__(self, setup: Setup) -> None:
        """ValueError, with a sentence, where the robot cannot stand at its start."""
        self.setup = setup
        self.trouble = Trouble()
        streams = [np.random.Generator(np.random.PCG64(s)) for s in np.random.SeedSequence(setup.seed).spawn(STREAMS)]
        floor = rasterize(setup.site)
        midnight = setup.begins.replace(hour=0, minute=0, second=0, microsecond=0)
        begins = (setup.begins - midnight).total_seconds()
        self.world = World(setup.site, setup.conditions, begins, streams[8])
        self.body = Body(setup.robot, setup.start, self.world, self.trouble, streams[5])
        self.body.charge.energy *= setup.conditions.battery
        self.people = People(
            setup.conditions, setup.site, self.world, begins, self.body.place, streams[0], streams[7]
        )  # fmt: skip
        mapped = floor.blocked()
        known_floor = surveyed(mapped, setup.site, setup.start)
        self.memory = Memory(mapped, self.body.outline, setup.robot.lidar, known_floor)
        self.robot = Robot(self.body, self.memory, self.body.pose)
        uneven = setup.conditions.uneven_floor
        self._scanner = Scanner(setup.robot, self.body.outline, uneven, TICKS_PER_S, streams[1], streams[3])
        self._sweeper = None if setup.robot.sweep is None else Sweeper(setup.robot.sweep, TICKS_PER_S, streams[4])
        surfaces = floor.blocked(door.name for door in setup.site.doors)
        field = field_of(surfaces, self.memory.known, known_floor, setup.robot.lidar)
        self.localization = Localization(field, setup.robot.lidar, self.body.wheels, setup.start, streams[2])
        self._faults = Faults(setup.conditions.faults, self.trouble, self._carry, streams[6])
        self._random_spots = streams[9]
        self._witness = Witness(self.world, self.body, self.robot, self.memory, self.trouble)
        self._clock = VirtualClock(setup.begins)
        self._ticks = 0
        self._next_telemetry = 0.0
        self._looks_per_tick = min(setup.robot.lidar.rate / TICKS_PER_S, 1.0)

    @property
    def clock(self) -> Clock:
        return self._clock

    @property
    def capabilities(self) -> frozenset[Capability]:
        return frozenset(Capability)

    def preparation(self) -> str:
        from backends.sim.kernels.window import choose
        from runner.site.compiled import is_kept

        return "" if is_kept(choose) else PREPARATION

    def open(self) -> None:
        """Compile the kernels, which takes seconds after an installation and a fraction of one later."""
        from backends.sim.warming import warm_up

        warm_up()

    def go(self, goal: Goal) -> None:
        if not goal.relative:
            self._witness.head_for(goal.pose)
        self.robot.go(goal, self._clock.seconds)

    def halt(self) -> None:
        self.localization.give_up()
        self.robot.halt(self._clock.seconds)

    def clear(self, action_id: int, radius: float) -> None:
        self.robot.clear(action_id, radius, self._clock.seconds)

    def replan(self, action_id: int) -> None:
        self.robot.replan(action_id, self._clock.seconds)

    def ease_back(self, action_id: int, distance: float) -> None:
        self.robot.ease_back(action_id, distance, self._clock.seconds)

    def relocate(self, action_id: int, pose: Pose | None) -> None:
        self.robot.relocate(action_id, self._clock.seconds)
        self.localization.relocate(pose)

    def charge(self) -> None:
        x, y, _ = self.body.place.tolist()
        chargers = (place.pose for place in self.setup.site.places)
        self.body.charge.charging = any(math.hypot(x - at.x, y - at.y) <= CHARGER_REACH_M for at in chargers)

    def reports(self, until: float) -> Sequence[Report]:
        """Compute ticks until there is news, at most up to `until`."""
        news = self.robot.news
        while (self.trouble.silent or not news) and (self._ticks + 1) / TICKS_PER_S <= until:
            self._tick()
        if self.trouble.silent or not news:
            self._clock.seconds = max(self._clock.seconds, until)
            return []
        taken = list(news)
        news.clear()
        return taken

    def truths(self) -> Sequence[Truth]:
        """What really was the case since the last call."""
        return self._witness.take()

    def close(self) -> None:
        """Nothing is held."""

    def _tick(self) -> None:
        self._ticks += 1
        now = self._clock.seconds = self._ticks / TICKS_PER_S
        place, bodies = self.body.place, self.people.bodies
        self._go_wrong(now)
        whole_second = self._ticks % TICKS_PER_S == 0
        self.world.advance(now, place.tolist(), self.body.outline, bodies, whole_second)
        self.people.advance(now, place, self.body.outline, TICK_S, whole_second)
        robot = self.robot
        self.localization.predict()
        robot.pose = self.localization.pose
        self._sense(bodies, now)
        wish = robot.think(now)
        if self._ticks % BETWEEN_LOOKS_TICKS == 0:
            self._witness.look(now, bodies)  # before the robot moves on: telemetry tells of where it was sensed to be
        self.body.advance(self.world, bodies, wish.speed, wish.side, wish.turn, TICK_S)
        if now >= self._next_telemetry:
            self._next_telemetry += TELEMETRY_S
            while self._next_telemetry <= now:
                self._next_telemetry += TELEMETRY_S
            if robot.idle:
                self._next_telemetry = max(self._next_telemetry, now + TELEMETRY_IDLE_S)
            if not self.trouble.silent:
                robot.news.append(self._telemetry(now))

    def _go_wrong(self, now: float) -> None:
        """Let faults begin and end. What was kept back by silence is told, as of now, when the silence ends."""
        silent = self.trouble.silent
        self._faults.advance(now)
        if silent and not self.trouble.silent:
            self.robot.news[:] = [replace(report, stamp=now) for report in self.robot.news]

    def _carry(self, to: Pose | None) -> None:
        """Somebody carries the robot to a pose, or to anywhere."""
        spot = spot_for(
            to, self.setup.site, self.world, self.people.bodies, self.body.outline, self._random_spots
        )  # fmt: skip
        if spot is not None:
            self._witness.carried()
            self.body.carry(spot)

    def _sense(self, people: NDArray[np.float64], now: float) -> None:
        """Look around, and take in what has been seen."""
        robot, world, wheels = self.robot, self.world, self.body.wheels
        idle = robot.idle
        if self._ticks % IDLE_TICKS_PER_LOOK == 0 if idle else self._is_time_to_look():
            self._scanner.look(
                self._ticks, self.body.pose, self.body.driven, wheels.pose, world.sight, people,
                self.trouble.lidar_blind,
            )  # fmt: skip
        if self._sweeper is not None and not idle and not robot.lost:
            self._sweeper.look(self.body.pose, robot.pose, world.distance, people, self.memory)
        if scan := self._scanner.deliver(self._ticks, wheels.pose):
            found = self.localization.correct(scan, now)
            robot.pose = self.localization.pose
            if self.localization.lost and not robot.lost:
                self.memory.disown(robot.pose)  # it was not there of late, nor was what it saw
            robot.lost = self.localization.lost
            if found is not None:
                robot.found(found, now)
            if robot.lost:
                self.memory.scan = scan  # seen, but not known where
            else:
                self.memory.take(scan, robot.pose)

    def _is_time_to_look(self) -> bool:
        """So many times a second as the lidar scans, as evenly as ticks allow."""
        return int(self._ticks * self._looks_per_tick) != int((self._ticks - 1) * self._looks_per_tick)

    def _telemetry(self, now: float) -> Telemetry:
        robot, body = self.robot, self.body
        return Telemetry(
            stamp=now,
            pose=robot.pose,
            spread=self.localization.spread,
            speed=math.hypot(body.drive.speed, body.drive.side) if body.drive.side else body.drive.speed,
            turn_rate=body.drive.turn,
            battery=body.charge.fraction,
            driven=body.driven,
            remaining=robot.remaining,
            route_number=robot.route_number,
            route=() if robot.route is None else robot.route.part(robot.track.covered, ROUTE_POINTS),
            obstacles=self.memory.shown(robot.pose),
        )
