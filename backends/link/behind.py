"""Any backend of virtual time as a robot on a socket: the simulator served in real time, or at some pace of it.

The backend is stepped up to the link's clock whenever the link asks for anything, so that what it says is never older
than one turn of the server. It may lag behind if the arithmetic is slower than the pace; then its stamps say so.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence

from backends.contract import ActionReport, Backend, Goal, GoalReport, GoalStatus, Telemetry
from backends.link.adapter import Doing, Drive, DriveNews, News, Robot, Standing, Task, TaskNews
from runner.site.values import Pose

STEPPING_S = 0.05
"""Wall seconds that one call may spend on stepping, so that the server keeps looking at its socket."""


class Behind:
    """An adapter for a backend that is open. `clock` is the link's, on which the backend's time begins at 0."""

    def __init__(self, backend: Backend, robot: Robot, start: Pose, clock: Callable[[], float]) -> None:
        self._backend = backend
        self._robot = robot
        self._clock = clock
        self._news: list[News] = []
        self._seen = Telemetry(0.0, start, 0.0, 0.0, 0.0, 1.0, 0.0, None, 0, (), ())

    def describe(self) -> Robot:
        return self._robot

    def drive(self, drive: Drive) -> None:
        self._step()
        self._backend.go(Goal(drive.id, drive.pose, drive.speed, drive.relative))

    def stop(self) -> None:
        self._step()
        self._backend.halt()

    def start(self, task: Task) -> None:
        self._step()
        backend = self._backend
        match task.doing:
            case Doing.CLEAR:
                backend.clear(task.id, task.amount)
            case Doing.REPLAN:
                backend.replan(task.id)
            case Doing.EASE_BACK:
                backend.ease_back(task.id, task.amount)
            case Doing.RELOCATE:
                backend.relocate(task.id, task.pose)
            case Doing.CHARGE:
                backend.charge()

    def look(self) -> Telemetry:
        return self._seen

    def news(self) -> Sequence[News]:
        self._step()
        taken, self._news = self._news, []
        return taken

    def _step(self) -> None:
        """Let the backend come up to the clock."""
        enough = time.monotonic() + STEPPING_S
        target = self._clock()
        while time.monotonic() < enough:
            for report in self._backend.reports(target):
                if isinstance(report, Telemetry):
                    self._seen = report
                elif (news := _news(report)) is not None:
                    self._news.append(news)
            if self._backend.clock.now() >= target:
                return


def _news(report: GoalReport | ActionReport) -> News | None:
    if isinstance(report, ActionReport):
        return TaskNews(report.action_id, report.done, report.reason)
    if report.status is GoalStatus.ACCEPTED:
        return None
    return DriveNews(report.goal_id, Standing(report.status.value), report.reason)
