"""Both sides of the link in virtual time, with a line between them that a seed makes as bad as is asked for.

Nothing waits: a step of the clock delivers what is due and lets both sides act. So a minute of a bad night takes
milliseconds, and a seed gives the same minute each time.
"""

from __future__ import annotations

import heapq
from dataclasses import dataclass, field
from random import Random

from backends.contract import ActionReport, Goal, GoalReport, Report, Telemetry
from backends.link.adapter import Robot
from backends.link.controller import Controller
from backends.link.ledger import Kept
from backends.link.robot_side import RobotSide
from runner.site.values import Pose
from tests.backends.link.toy import PointRobot

STEP_S = 0.02


@dataclass(frozen=True, slots=True)
class Badness:
    """What a line does to a frame: shares of 0 to 1, and delays in seconds."""

    delay: float = 0.001
    delay_spread: float = 0.0
    drop: float = 0.0
    repeat: float = 0.0
    corrupt: float = 0.0
    cuts: tuple[tuple[float, float], ...] = ()
    """From when to when nothing gets through."""
    held: bool = False
    """Whether a cut holds frames back and lets them go when it ends, as a stuck connection does, or loses them."""


GOOD = Badness()


@dataclass(slots=True)
class Wire:
    """One direction of a line."""

    badness: Badness
    random: Random
    waiting: list[tuple[float, int, bytes, bytes]] = field(default_factory=list)
    count: int = 0

    def send(self, peer: bytes, frame: bytes, now: float) -> None:
        bad, random = self.badness, self.random
        if random.random() < bad.drop:
            return
        for _ in range(2 if random.random() < bad.repeat else 1):
            due = now + bad.delay + random.random() * bad.delay_spread
            for start, end in bad.cuts:
                if start <= now < end:
                    if not bad.held:
                        return
                    due = max(due, end + random.random() * 0.05)
            if random.random() < bad.corrupt:
                frame = corrupted(frame, random)
            self.count += 1
            heapq.heappush(self.waiting, (due, self.count, peer, frame))

    def due(self, now: float) -> list[tuple[bytes, bytes]]:
        found = []
        while self.waiting and self.waiting[0][0] <= now:
            _, _, peer, frame = heapq.heappop(self.waiting)
            found.append((peer, frame))
        return found


def corrupted(frame: bytes, random: Random) -> bytes:
    """The frame with one to three bytes changed."""
    changed = bytearray(frame)
    for _ in range(random.randint(1, 3)):
        at = random.randrange(len(changed))
        changed[at] ^= random.randint(1, 255)
    return bytes(changed)


class Rig:
    """A robot and any number of controllers on one line, in virtual time."""

    def __init__(self, badness: Badness = GOOD, seed: int = 1, robot: Robot | None = None) -> None:
        self.now = 0.0
        self.random = Random(seed)  # noqa: S311  a test's chance, not a secret
        self.to_robot = Wire(badness, Random(seed * 2 + 1))  # noqa: S311
        self.to_controllers = Wire(badness, Random(seed * 2 + 2))  # noqa: S311
        self.point = PointRobot(self.clock, robot)
        self.booted = 0.0
        self.side = RobotSide(self.point, self.robot_clock, token=self.token)
        self.controllers: dict[bytes, Controller] = {}
        self.reports: dict[bytes, list[Report]] = {}

    def clock(self) -> float:
        return self.now

    def robot_clock(self) -> float:
        return self.now - self.booted

    def token(self) -> str:
        return f"{self.random.getrandbits(128):032x}"

    def controller(self, session: str = "session-one", peer: bytes = b"a") -> Controller:
        """A controller, in place of the one that was reached by that peer before."""
        made = Controller(session, "rig", self.clock, token=self.token)
        self.controllers[peer] = made
        self.reports.setdefault(peer, [])
        return made

    def restart_robot(self, kept: Kept | None = None) -> None:
        """The robot's program is started again: it stands, its clock begins anew, it knows what was kept."""
        self.side.stop()
        self.booted = self.now
        before = self.point
        self.point = PointRobot(self.robot_clock, before.robot)
        self.point.pose, self.point.drives = before.pose, before.drives
        self.side = RobotSide(self.point, self.robot_clock, kept, self.token)

    def run(self, seconds: float) -> None:
        """Let so much time pass."""
        end = self.now + seconds
        while self.now < end - 1e-9:
            self.step()

    def run_until_ended(self, goal: int, seconds: float = 60.0, peer: bytes = b"a") -> GoalReport:
        """Let time pass until a goal has ended, and hand back how."""
        end = self.now + seconds
        while self.now < end:
            self.step()
            if found := [report for report in self.goal_ends(peer) if report.goal_id == goal]:
                return found[0]
        raise AssertionError(f"goal {goal} did not end within {seconds} s")

    def step(self) -> None:
        self.now += STEP_S
        for peer, frame in self.to_robot.due(self.now):
            self._from_robot(self.side.receive(peer, "", frame))
        self._from_robot(self.side.turn())
        for peer, frame in self.to_controllers.due(self.now):
            if peer in self.controllers:
                self.controllers[peer].receive(frame)
        for peer, controller in self.controllers.items():
            for frame in controller.due():
                self.to_robot.send(peer, frame, self.now)
            self.reports[peer] += controller.reports()

    def _from_robot(self, frames: list[tuple[bytes, bytes]]) -> None:
        for peer, frame in frames:
            self.to_controllers.send(peer, frame, self.now)

    # --- what came of it

    def goal_ends(self, peer: bytes = b"a") -> list[GoalReport]:
        """The reports that ended goals, in order."""
        return [
            report
            for report in self.reports[peer]
            if isinstance(report, GoalReport) and report.status.value not in ("accepted", "under way")
        ]

    def answers(self, peer: bytes = b"a") -> list[ActionReport]:
        return [report for report in self.reports[peer] if isinstance(report, ActionReport)]

    def telemetry(self, peer: bytes = b"a") -> list[Telemetry]:
        return [report for report in self.reports[peer] if isinstance(report, Telemetry)]


def goal(number: int, x: float = 3.0, speed: float = 0.5, relative: bool = False) -> Goal:
    """A goal on the x axis."""
    return Goal(number, Pose(x, 0.0, 0.0), speed, relative)
