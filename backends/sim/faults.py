"""Faults on demand and by rate: at their times they set what is wrong with the robot, and end it again.

Faults by rate are a Poisson process. Two of a kind at once count as one that lasts until the later end.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np

from backends.sim.trouble import Trouble
from runner.site.values import Fault, FaultKind, Pose

Carry = Callable[[Pose | None], None]
"""Puts the robot somewhere else: at the pose, or anywhere."""


class Faults:
    """What goes wrong with one robot, and when."""

    def __init__(self, faults: Sequence[Fault], trouble: Trouble, carry: Carry, generator: np.random.Generator) -> None:
        self._trouble = trouble
        self._carry = carry
        self._random = generator
        self._faults = tuple(faults)
        self._due = [self._gap(fault) if fault.at_s is None else fault.at_s for fault in faults]
        self._ends = dict.fromkeys(FaultKind, -math.inf)
        self._next = min(self._due, default=math.inf)
        """When something begins or ends: until then there is nothing to do."""

    def advance(self, now: float) -> None:
        """Let faults begin and end that are due."""
        if now < self._next:
            return
        for kind, ends in self._ends.items():
            if -math.inf < ends <= now:
                self._ends[kind] = -math.inf
                self._set(kind, False, 0.0)
        for number, fault in enumerate(self._faults):
            if self._due[number] <= now:
                self._begin(fault, now)
                self._due[number] = math.inf if fault.per_hour is None else now + self._gap(fault)
        lasting = (ends for ends in self._ends.values() if ends > -math.inf)
        self._next = min([*self._due, *lasting], default=math.inf)

    def _gap(self, fault: Fault) -> float:
        return float(self._random.exponential(3600.0 / fault.per_hour)) if fault.per_hour else math.inf

    def _begin(self, fault: Fault, now: float) -> None:
        if fault.kind is FaultKind.CARRIED:
            self._carry(fault.to)
            return
        self._ends[fault.kind] = max(self._ends[fault.kind], now + fault.for_s)
        self._set(fault.kind, True, fault.slip)

    def _set(self, kind: FaultKind, wrong: bool, slip: float) -> None:
        match kind:
            case FaultKind.WHEELS_STUCK:
                self._trouble.wheels_stuck = wrong
            case FaultKind.SLIP:
                self._trouble.slip = slip
            case FaultKind.LIDAR_BLIND:
                self._trouble.lidar_blind = wrong
            case FaultKind.EMERGENCY_STOP:
                self._trouble.stopped = wrong
            case FaultKind.SILENT:
                self._trouble.silent = wrong
