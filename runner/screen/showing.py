"""What a screen is given: the run it is to show, and where the news comes from.

The screen holds no mission logic and knows no host. Whoever starts it hands over a `Showing` once, and a `Source`
that it pulls a few times a second. A source lives in another thread and must never wait for the screen, because a
terminal that stops reading can hold the screen up for many seconds.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

from runner.host.messages import Deed, Done
from runner.host.view import FeedLine, View
from runner.machine.table import StepNote
from runner.site.values import Point, RobotDescription, Site


@dataclass(frozen=True, slots=True)
class Showing:
    """What does not change during a run. `report_hint` is the command that shows the record afterwards, `pick_up_hint`
    the one that goes on with a run whose process died. `troubles` are the places of the incidents so far, `way` is
    where the robot has been, as far back as is worth showing, oldest first."""

    mission: str
    run: str
    site: Site
    robot: RobotDescription
    steps: tuple[StepNote, ...]
    report_hint: str
    pick_up_hint: str = ""
    troubles: tuple[Point, ...] = ()
    way: tuple[Point, ...] = ()


class Source(Protocol):
    """What tells of a run, and passes on what a person asks for. Every call returns at once."""

    def view(self) -> View | None:
        """The latest view, however old; None before the first."""

    def age(self) -> float:
        """Seconds since the run gave the sign of life that the latest view shows."""

    def feed(self) -> Sequence[FeedLine]:
        """Lines that are new since the last call, oldest first."""

    def do(self, deed: Deed, text: str = "") -> str:
        """Pass on what a person asks for. Its id, by which `answers` tells what came of it."""

    def answers(self) -> Sequence[Done]:
        """What came of deeds since the last call."""
