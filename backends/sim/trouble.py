"""What is wrong with the robot right now, whatever made it so. Parts of the robot read it, only faults change it."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(slots=True)
class Trouble:
    """All well, to begin with."""

    wheels_stuck: bool = False
    """The wheels do not turn, whatever is asked of them."""
    slip: float = 0.0
    """Share of the way the wheels turn that the floor does not give, 0 to 1. Odometry does not see it."""
    lidar_blind: bool = False
    """No beam comes back."""
    stopped: bool = False
    """The emergency stop is pressed: the drive has no power."""
    silent: bool = False
    """Nothing is reported."""
