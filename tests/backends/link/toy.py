"""A robot that is a point, for tests of the link: it turns on the spot at once and drives straight to its goal.

It keeps an account of what it was asked to do, to compare with what the other side believes.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import atan2, cos, hypot, sin

from backends.contract import Telemetry
from backends.link.adapter import Doing, Drive, DriveNews, News, Robot, Standing, Task, TaskNews
from runner.site.values import Pose

ABILITIES = frozenset({"clear", "replan", "ease back", "relocate", "charge", "relative moves"})
BRAKING_S = 0.1
"""Time from being told to stop to standing."""


class PointRobot:
    """An adapter of a robot that moves as `clock` goes on."""

    def __init__(self, clock: Callable[[], float], robot: Robot | None = None, task_seconds: float = 0.3) -> None:
        self.robot = robot or Robot("point", ABILITIES, 1.0)
        self.pose = Pose(0.0, 0.0, 0.0)
        self.driven = 0.0
        self.drives: list[Drive] = []
        self.stops = 0
        self.charging = False
        self._clock = clock
        self._task_seconds = task_seconds
        self._at = clock()
        self._target: Pose | None = None
        self._speed = 0.0
        self._drive: Drive | None = None
        self._braked: float | None = None
        self._tasks: list[tuple[float, Task]] = []
        self._news: list[News] = []

    def describe(self) -> Robot:
        return self.robot

    def drive(self, drive: Drive) -> None:
        self._move()
        self.drives.append(drive)
        self._drive, self._braked = drive, None
        target = drive.pose
        if drive.relative:
            c, s, (x, y) = cos(self.pose.heading), sin(self.pose.heading), (drive.pose.x, drive.pose.y)
            target = Pose(self.pose.x + c * x - s * y, self.pose.y + s * x + c * y, self.pose.heading)
        self._target, self._speed = target, drive.speed
        self._news.append(DriveNews(drive.id, Standing.UNDER_WAY))

    def stop(self) -> None:
        self._move()
        self.stops += 1
        self._braked = self._clock() + BRAKING_S
        self._news += [TaskNews(task.id, False, "stopped") for _, task in self._tasks]
        self._tasks.clear()

    def start(self, task: Task) -> None:
        if task.doing is Doing.CHARGE:
            self.charging = True
        else:
            self._tasks.append((self._clock() + self._task_seconds, task))

    def look(self) -> Telemetry:
        self._move()
        left = self._left()
        return Telemetry(
            stamp=self._at,
            pose=self.pose,
            spread=0.02,
            speed=0.0 if self._drive is None else self._speed,
            turn_rate=0.0,
            battery=0.8,
            driven=self.driven,
            remaining=left if self._drive else None,
            route_number=len(self.drives),
            route=((self.pose.x, self.pose.y),),
            obstacles=(),
        )

    def news(self) -> Sequence[News]:
        self._move()
        for due, task in list(self._tasks):
            if due <= self._at:
                self._tasks.remove((due, task))
                self._news.append(TaskNews(task.id, True))
        taken, self._news = self._news, []
        return taken

    def _left(self) -> float:
        return 0.0 if self._target is None else hypot(self._target.x - self.pose.x, self._target.y - self.pose.y)

    def _move(self) -> None:
        now = self._clock()
        step, self._at = now - self._at, now
        if self._drive is None or self._target is None:
            return
        if self._braked is not None and now >= self._braked:
            self._end(Standing.HALTED)
            return
        left, covered = self._left(), self._speed * step
        if covered >= left:
            self.driven += left
            self.pose = self._target
            self._end(Standing.ARRIVED)
            return
        heading = atan2(self._target.y - self.pose.y, self._target.x - self.pose.x)
        self.pose = Pose(self.pose.x + covered * cos(heading), self.pose.y + covered * sin(heading), heading)
        self.driven += covered

    def _end(self, standing: Standing) -> None:
        assert self._drive is not None
        self._news.append(DriveNews(self._drive.id, standing))
        self._drive = self._braked = None
