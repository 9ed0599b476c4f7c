"""The built-in robot and its world, in virtual time. What is modeled, and what is not, is in MODEL.md.

Importing this is cheap; `create` loads the rest.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from backends.contract import Backend, Setup


def create(setup: Setup) -> Backend:
    """A simulated robot on its floor. ValueError, with a sentence, where the robot cannot stand at the start."""
    from backends.sim.simulator import Simulator

    return Simulator(setup)
