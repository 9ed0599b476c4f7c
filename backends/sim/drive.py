"""What wheels can do: speeds change no faster than the limits allow."""

from __future__ import annotations

from dataclasses import dataclass

from runner.site.values import RobotDescription

REST = 1e-9
"""A speed below this is none: what is left by rounding would keep the robot from ever standing still."""


@dataclass(slots=True)
class Drive:
    """The speeds that the wheels have now: ahead and to the left, m/s, and the turn rate, rad/s.

    A drive that cannot go sideways has a sideways speed of 0 at all times.
    """

    limits: RobotDescription
    speed: float = 0.0
    side: float = 0.0
    turn: float = 0.0

    def toward(self, speed: float, side: float, turn: float, time: float) -> None:
        """Come as near to the wanted speeds as the accelerations allow within `time` seconds."""
        limits = self.limits
        speed = min(max(speed, -limits.reverse_speed), limits.speed)
        side = min(max(side, -limits.sideways_speed), limits.sideways_speed)
        turn = min(max(turn, -limits.turn_speed), limits.turn_speed)
        self.speed = _approach(self.speed, speed, limits.acceleration * time)
        self.side = _approach(self.side, side, limits.acceleration * time)
        self.turn = _approach(self.turn, turn, limits.turn_acceleration * time)

    def stop(self) -> None:
        """Something hard stopped the robot."""
        self.speed = self.side = self.turn = 0.0

    @property
    def still(self) -> bool:
        return self.speed == 0.0 and self.side == 0.0 and self.turn == 0.0


def _approach(value: float, wanted: float, most: float) -> float:
    nearer = min(max(wanted, value - most), value + most)
    return nearer if abs(nearer) > REST else 0.0
