"""The run as plain lines, for pipes, logs, screen readers and terminals that cannot hold a screen.

Says the same as the screen does: each line of the feed as it comes, and where the run stands now and then. ASCII,
one thing a line, flushed at once. The same run gives the same lines: only the run's own time is looked at. A reader
that goes away (`| head`) is no reason to stop the robot: the printer falls silent and the run goes on.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import TextIO

from runner.host.view import FeedLine, Health, View
from runner.screen.outlet import Outlet, to_nowhere
from runner.screen.terminal import clean, to_ascii
from runner.screen.words import advice_for, amount, ends_about, is_lost, laps, legs_so_far, line_so_far, spell_seconds


class PlainPrinter:
    """Prints feed lines as `HH:MM:SS  text`, and a line of progress where the feed was silent for `every` seconds of
    the run."""

    def __init__(self, stream: TextIO | Outlet, every: float = 60.0) -> None:
        self._stream = stream
        self._every = every
        self._last = 0.0
        self._gone = False
        self._lost = False
        self._needed = ""

    @property
    def gone(self) -> bool:
        """Whether the reader went away."""
        return self._gone

    def show(self, lines: Iterable[FeedLine], view: View | None, age: float = 0.0) -> None:
        """Print what is new. To be called whenever there may be news; it never raises for a closed stream.

        `age` is for how many seconds nothing has been heard from the run.
        """
        for line in lines:
            self._print(line.clock, line.text)
            self._last = max(self._last, line.stamp)
        if view is not None:
            self._say_if_lost(view, age)
            self._say_if_needed(view)
        if self._lost:
            return
        if view is not None and view.health is not Health.ENDED and view.stamp >= self._last + self._every:
            self._print(view.clock, progress(view))
            self._last = view.stamp

    def _say_if_lost(self, view: View, age: float) -> None:
        """Once when the news stop, and once when they come again."""
        lost = is_lost(view, age)
        if lost and not self._lost:
            self._print(view.clock, f"no news for {spell_seconds(age)}, since {view.clock}; keeps trying")
        elif self._lost and not lost:
            self._print(view.clock, "there is news again")
        self._lost = lost

    def _say_if_needed(self, view: View) -> None:
        """Once for each question or trouble that a person is needed for."""
        needed = (view.question or view.reason) if view.health is Health.NEEDS_YOU else ""
        if needed and needed != self._needed:
            how = f"answer with: trundle answer {' | '.join(view.answers)}" if view.answers else advice_in_words(view)
            self._print(view.clock, f"needs you: {needed}; {how}")
        self._needed = needed

    def _print(self, clock: str, text: str) -> None:
        if self._gone:
            return
        try:
            self._stream.write(to_ascii(clean(f"{clock}  {text}")) + "\n")
            self._stream.flush()
        except (BrokenPipeError, ValueError):
            self._gone = True
            to_nowhere(self._stream)


def advice_in_words(view: View) -> str:
    """What to do where no key can be pressed."""
    return "trundle release goes on, trundle abort ends it" if view.health is Health.NEEDS_YOU else advice_for(view)


def progress(view: View) -> str:
    """Where the run stands, in one line."""
    parts = [f"{view.health.value}: {view.reason}" if view.reason else view.health.value]
    if view.place is not None and view.remaining is not None:
        parts.append(f"{amount(view.remaining, 'm')} to {view.place}")
    if view.leg_seconds is not None:
        limit = f" of {spell_seconds(view.leg_limit)}" if view.leg_limit is not None else ""
        parts.append(f"leg {spell_seconds(view.leg_seconds)}{limit}")
    if view.battery is not None:
        parts.append(f"battery {view.battery * 100:.0f} %")
    told = [laps(view), legs_so_far(view), ends_about(view), ", ".join(part for part in line_so_far(view) if part)]
    return "; ".join([*parts, *(part for part in told if part)])
