"""What a screen is given: the run it is to show, and where the news comes from.

The screen holds no mission logic and knows no host. Whoever starts it hands over a `Showing` once, and a `Source`
that it pulls a few times a second. A source lives in another thread and must never wait for the screen, because a
terminal that stops reading can hold the screen up for many seconds.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

from runner.host.view import FeedLine, View
from runner.machine.table import Event, StepNote
from runner.site.values import RobotDescription, Site


@dataclass(frozen=True, slots=True)
class Showing:
    """What does not change during a run. `report_hint` is the command that shows the record afterwards."""

    mission: str
    run: str
    site: Site
    robot: RobotDescription
    steps: tuple[StepNote, ...]
    report_hint: str


class Source(Protocol):
    """What the thread that owns the run offers. Every call returns at once."""

    def view(self) -> View | None:
        """The latest view, None before the first."""

    def feed(self) -> Sequence[FeedLine]:
        """Lines that are new since the last call, oldest first."""

    def act(self, event: Event) -> None:
        """Pass on what a person asks for: HOLD, RELEASE, SKIP or ABORT."""
