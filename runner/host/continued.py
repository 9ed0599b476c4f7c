"""A backend whose time and odometer go on from where an earlier process left them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from typing import Any, cast

from backends.contract import Backend, Report, Telemetry


@dataclass(frozen=True, slots=True)
class ContinuedClock:
    """A clock that is so many seconds ahead of the backend's."""

    backend: Backend
    seconds: float

    @property
    def virtual(self) -> bool:
        return self.backend.clock.virtual

    def now(self) -> float:
        return self.backend.clock.now() + self.seconds

    def wall(self) -> datetime:
        return self.backend.clock.wall()


def continued(backend: Backend, seconds: float, meters: float) -> Backend:
    """The same robot, with its time and odometer ahead by so much."""
    return cast(Backend, Continued(backend, seconds, meters))


class Continued:
    """The same robot, with `seconds` added to each stamp and `meters` to what it has driven.

    Everything else is the backend's own.
    """

    def __init__(self, backend: Backend, seconds: float, meters: float) -> None:
        self._backend = backend
        self._seconds = seconds
        self._meters = meters
        self.clock = ContinuedClock(backend, seconds)

    def __getattr__(self, name: str) -> Any:
        return getattr(self._backend, name)

    def reports(self, until: float) -> Sequence[Report]:
        return [self._shifted(report) for report in self._backend.reports(until - self._seconds)]

    def _shifted(self, report: Report) -> Report:
        stamp = report.stamp + self._seconds
        if isinstance(report, Telemetry):
            return replace(report, stamp=stamp, driven=report.driven + self._meters)
        return replace(report, stamp=stamp)
