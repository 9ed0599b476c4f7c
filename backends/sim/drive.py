"""What wheels can do: speeds change no faster than the limits allow."""

from __future__ import annotations

from dataclasses import dataclass

from runner.site.values import RobotDescription


@dataclass(slots=True)
class Drive:
    """The speed and turn rate that the wheels have now, m/s and rad/s."""

    limits: RobotDescription
    speed: float = 0.0
    turn: float = 0.0

    def toward(self, speed: float, turn: float, time: float) -> None:
        """Come as near to the wanted speeds as the accelerations allow within `time` seconds."""
        limits = self.limits
        speed = min(max(speed, -limits.reverse_speed), limits.speed)
        turn = min(max(turn, -limits.turn_speed), limits.turn_speed)
        self.speed = _approach(self.speed, speed, limits.acceleration * time)
        self.turn = _approach(self.turn, turn, limits.turn_acceleration * time)

    def stop(self) -> None:
        """Something hard stopped the robot."""
        self.speed = self.turn = 0.0

    @property
    def still(self) -> bool:
        return self.speed == 0.0 and self.turn == 0.0


def _approach(value: float, wanted: float, most: float) -> float:
    return min(max(wanted, value - most), value + most)
