"""What wheels and battery can do: speeds change no faster than the limits allow, energy runs out."""

from __future__ import annotations

from dataclasses import dataclass

from runner.site.values import Battery, RobotDescription


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


@dataclass(slots=True)
class Charge:
    """The energy in the battery, watt-hours. It is full when the run begins."""

    battery: Battery
    energy: float
    charging: bool = False

    @property
    def fraction(self) -> float:
        return self.energy / self.battery.capacity

    @property
    def empty(self) -> bool:
        return self.energy <= 0.0

    def spend(self, driving: bool, time: float) -> None:
        """Let `time` seconds pass: what is drawn is taken, what the charger gives is added."""
        power = -self.battery.driving if driving else -self.battery.idle
        if self.charging:
            power = self.battery.charging
        self.energy = min(max(self.energy + power * time / 3600.0, 0.0), self.battery.capacity)
