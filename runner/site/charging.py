"""How long a battery takes to charge: constant power up to a fraction, then tapering as at constant voltage."""

from __future__ import annotations

import math

from runner.site.values import Battery

CUT_OFF = 0.05
"""Of the charging power: below this the charger does not taper any further, until the battery is full."""


def charging_seconds(battery: Battery, start: float, end: float) -> float:
    """Seconds from one fraction of its capacity to a higher one; 0 where it holds as much already."""
    knee = battery.tapers_from
    slowest = 1.0 - CUT_OFF * (1.0 - knee)
    hours_full = battery.capacity / battery.charging
    steady = max(0.0, min(end, knee) - start)
    low, high = max(start, knee), min(end, slowest)
    tapering = (1.0 - knee) * math.log((1.0 - low) / (1.0 - high)) if high > low else 0.0
    ending = max(0.0, end - max(start, slowest)) / CUT_OFF if knee < 1.0 else 0.0
    return 3600.0 * hours_full * (steady + tapering + ending)
