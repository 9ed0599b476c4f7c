"""Telemetry as it comes in, on our clock: only the newest is ever handed out, and stamps never fall."""

from __future__ import annotations

from backends.contract import Telemetry
from backends.link.messages import Seen
from backends.link.quality import Line
from runner.site.values import Pose


class Sightings:
    """Turns the robot's stamps and its odometer into ours, across restarts of its program."""

    def __init__(self, line: Line) -> None:
        self.seen = 0
        """The highest number of telemetry that came, or that will not come any more."""
        self._line = line
        self._number = 0
        self._newest: Seen | None = None
        self._newest_stamp = 0.0
        self._last_stamp = 0.0
        self._driven = 0.0
        self._odometer: float | None = None

    def begin_anew(self) -> None:
        """The robot's program was started again: its numbers, its clock and its odometer begin anew."""
        self.seen = self._number = 0
        self._newest = None
        self._odometer = None
        self._line.forget_clock()

    def take(self, seen: Seen, now: float) -> bool:
        """Note telemetry; False for what is a repetition or was overtaken."""
        self.seen = max(self.seen, seen.number)
        if seen.number <= self._number:
            return False
        self._number = seen.number
        if self._odometer is not None:
            self._driven += max(0.0, seen.driven - self._odometer)
        self._odometer = seen.driven
        self._newest = seen
        self._newest_stamp = min(seen.stamp - self._line.offset, now)
        return True

    def skip_to(self, number: int) -> None:
        """The robot says that it has sent telemetry up to this number: what has not come is lost."""
        self.seen = max(self.seen, number)

    def stamp_of(self, stamp: float, now: float) -> float:
        """The robot's stamp on our clock: not after now, and not before what was reported before."""
        self._last_stamp = max(self._last_stamp, min(stamp - self._line.offset, now))
        return self._last_stamp

    def stamp_now(self, now: float) -> float:
        """The stamp for something that is known here and now."""
        self._last_stamp = max(self._last_stamp, now)
        return self._last_stamp

    def newest(self) -> Telemetry | None:
        """The newest telemetry, once; None where there was none since the last call."""
        seen, self._newest = self._newest, None
        if seen is None:
            return None
        stamp = max(self._last_stamp, self._newest_stamp)
        self._last_stamp = stamp
        return Telemetry(
            stamp=stamp,
            pose=Pose(*seen.pose),
            spread=seen.spread,
            speed=seen.speed,
            turn_rate=seen.turn_rate,
            battery=seen.battery,
            driven=self._driven,
            remaining=seen.remaining,
            route_number=seen.route_number,
            route=tuple(seen.route),
            obstacles=tuple(seen.obstacles),
        )
