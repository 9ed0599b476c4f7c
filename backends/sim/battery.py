"""The battery: what is drawn is taken out, and a charger puts it back, at full power at first and tapering near full.

Constant power up to a fraction, then as a cell charged at constant voltage: the current falls in proportion to what
is missing, so what is missing decays exponentially, until the charger ends it at a small current.
"""

from __future__ import annotations

from dataclasses import dataclass

from runner.site.charging import CUT_OFF
from runner.site.values import Battery


@dataclass(slots=True)
class Charge:
    """The energy in the battery, watt-hours."""

    battery: Battery
    energy: float
    charging: bool = False

    @property
    def fraction(self) -> float:
        return self.energy / self.battery.capacity

    @property
    def empty(self) -> bool:
        return self.energy <= 0.0

    @property
    def accepted(self) -> float:
        """The power the battery takes from a charger as full as it is now, watts."""
        battery = self.battery
        room = 1.0 - battery.tapers_from
        share = (1.0 - self.fraction) / room if room > 0.0 else 1.0
        return battery.charging * min(max(share, CUT_OFF), 1.0)

    def spend(self, driving: bool, time: float) -> None:
        """Let `time` seconds pass: what is drawn is taken, or, while charging, what the charger gives is added."""
        power = -self.battery.driving if driving else -self.battery.idle
        if self.charging:
            power = self.accepted
        self.energy = min(max(self.energy + power * time / 3600.0, 0.0), self.battery.capacity)
