"""The Textual program that shows a run while it goes on.

It pulls its source four times a second and shows what it is told. A key becomes an event that is handed to the source
at once; what comes of it is seen in the next view. Aborting takes two keystrokes. A run that has a process of
its own goes on when the screen is left. Where it lives in the screen's process, leaving means aborting it, and that is
asked, never done in silence.
"""

from __future__ import annotations

import os
import sys
import time
from collections import deque
from collections.abc import Callable
from dataclasses import replace
from typing import ClassVar

from textual.app import App, ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container
from textual.events import Resize
from textual.timer import Timer

from runner.host.view import FeedLine, Health, View
from runner.machine.table import Event
from runner.screen.arrangement import HEADER_ROWS, Arrangement, arrange
from runner.screen.floor_drawing import FloorDrawing
from runner.screen.footer import Question, feed, keys, rule
from runner.screen.header import BEFORE, header
from runner.screen.ink import ASCII, DOTTED, Glyphs, Ink, Row, cut
from runner.screen.outline import outline, summary
from runner.screen.painted import COLORLESS, LOOKS, FloorPanel, Panel
from runner.screen.showing import Showing, Source
from runner.screen.terminal import ascii_only

PULL_S = 0.25
FEED_KEPT = 500
REMARK_S = 4.0
BROKE_OFF = "what ran it has failed; leave to read why"
OLD_AFTER_S = 5.0
"""A view that has not changed for so long is said to be old, while the run is under way (starting may take longer)."""


def watch(showing: Showing, source: Source, over: Callable[[], bool] = lambda: False, outlives: bool = False) -> bool:
    """Show the run until the person leaves. False where the screen itself broke, so that the caller can go on in
    plain lines; the run is not touched by that.

    `over` tells whether what runs it has come to an end, in whatever way: then no more views can come, and a run whose
    last view does not say how it ended is shown as broken off. A run that `outlives` its screen goes on when the
    screen is left.
    """
    glyphs = ASCII if ascii_only(os.environ, sys.stderr.encoding) else DOTTED
    app = WatchApp(showing, source, glyphs, over, outlives)
    app.run(mouse=False)  # so that the terminal's own selecting and copying keep working
    return not app.return_code


class WatchApp(App[None]):
    """The screen of one run."""

    ENABLE_COMMAND_PALETTE = False
    CSS = """
    Screen { layout: vertical; overflow: hidden; }
    #body { overflow: hidden; }
    Slice { width: 1fr; height: 100%; }
    """
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("h", "act('HOLD')", "hold"),
        Binding("r", "act('RELEASE')", "release"),
        Binding("s", "act('SKIP')", "skip"),
        Binding("a", "ask_abort", "abort"),
        Binding("q,ctrl+q", "leave", "leave", priority=True),
        Binding("ctrl+c", "interrupt", "abort", priority=True),
        Binding("y", "confirm", "yes"),
        Binding("escape,n", "dismiss", "no"),
    ]

    def __init__(
        self,
        showing: Showing,
        source: Source,
        glyphs: Glyphs,
        over: Callable[[], bool] = lambda: False,
        outlives: bool = False,
    ) -> None:
        super().__init__(ansi_color=True)
        self._over, self._outlives = over, outlives
        looks = COLORLESS if self.no_color else LOOKS
        self._showing, self._source, self._glyphs = showing, source, glyphs
        self._drawing = FloorDrawing(showing.site, showing.robot, glyphs)
        self._arrangement = self._arrange(80, 24)
        self._view: View | None = None
        self._feed: deque[FeedLine] = deque(maxlen=FEED_KEPT)
        self._question: Question | None = None
        self._remark, self._remark_until = "", 0.0
        self._changed_at = time.monotonic()
        self._aborting = self._leaving = False
        self._pulling: Timer | None = None
        self._header, self._steps = Panel(looks, "header"), Panel(looks, "steps")
        self._rule, self._lines, self._keys = Panel(looks, "rule"), Panel(looks, "feed"), Panel(looks, "keys")
        self._floor = FloorPanel(looks)
        self._body = Container(self._floor, self._steps, id="body")

    # --- layout ---------------------------------------------------------------------------------------------

    def compose(self) -> ComposeResult:
        yield from (self._header, self._body, self._rule, self._lines, self._keys)

    def on_resize(self, event: Resize) -> None:
        self._arrangement = arranged = self._arrange(event.size.width, event.size.height)
        self._header.styles.height = HEADER_ROWS
        self._rule.styles.height = self._keys.styles.height = 1
        self._lines.styles.height = arranged.feed_rows
        self._body.styles.layout = "vertical" if arranged.stacked else "horizontal"
        self._body.styles.height = arranged.steps_rows + (arranged.floor_rows if arranged.stacked else 0)
        self._floor.styles.width, self._floor.styles.height = arranged.floor_columns, arranged.floor_rows
        self._floor.display = arranged.floor_rows > 0
        self._steps.styles.width, self._steps.styles.height = arranged.steps_columns, arranged.steps_rows
        self.call_after_refresh(self._redraw)

    def _arrange(self, columns: int, rows: int) -> Arrangement:
        return arrange(columns, rows, self._showing.site.width / self._showing.site.height)

    def _redraw(self) -> None:
        if self._arrangement.floor_rows:
            self._drawing.resize(self._arrangement.floor_columns, self._arrangement.floor_rows)
        self.pull()
        if self._pulling is None:  # nothing is shown before there is a place for it
            self._pulling = self.set_interval(PULL_S, self.pull)

    # --- what is shown --------------------------------------------------------------------------------------

    def pull(self) -> None:
        """Take what is new and show it."""
        over = self._over()  # asked first: the last view is posted before the run is over
        view = self._source.view()
        if over and (view is None or view.outcome is None):
            view = replace(view or BEFORE, health=Health.ENDED, outcome="broke off", reason=BROKE_OFF)
        if self._view is not None and view is not None and view.health is not self._view.health:
            self._remark = ""  # what was asked for, or something else, has happened
        if view != self._view:
            self._view, self._changed_at = view, time.monotonic()
        self._feed.extend(self._source.feed())
        self._show()
        if self._leaving and self._ended:
            self.exit()

    @property
    def _ended(self) -> bool:
        return self._view is not None and self._view.outcome is not None

    def _show(self) -> None:
        width, arranged, glyphs = self.size.width, self._arrangement, self._glyphs
        if self._ended and self._question is not None:
            self._question = None
        self._header.show(header(self._view, self._showing, width, glyphs, self._said()))
        if arranged.floor_rows:
            self._drawing.aim(self._view.place if self._view is not None else None)
            self._floor.show(self._drawing.still, self._drawing.moving(self._view))
        self._steps.show(self._step_rows())
        self._rule.show([rule(width, glyphs, arranged.floor_rows > 0)])
        self._lines.show(feed(self._feed, width, arranged.feed_rows, glyphs))
        self._keys.show([keys(self._view, self._question, width, glyphs)])

    def _step_rows(self) -> list[Row]:
        arranged, glyphs = self._arrangement, self._glyphs
        edge = " " if arranged.stacked else f"{glyphs.upright} "
        width, height = arranged.steps_columns - len(edge), arranged.steps_rows
        title: Row = ((cut(glyphs.say(self._showing.mission), width, glyphs.more), Ink.STRONG),)
        if self._view is not None and self._ended:
            rows = summary(self._view, self._showing.report_hint, width, glyphs)
        else:
            rows = outline(self._showing.steps, self._view, width, height - 1, glyphs)
        padded = [title, *rows, *([()] * height)]
        return [((edge, Ink.FAINT), *row) for row in padded[:height]]

    def _said(self) -> str:
        """What stands in for the advice: news too old to trust, or the answer to the last key."""
        if self._ended:
            return ""
        old = time.monotonic() - self._changed_at
        if old >= OLD_AFTER_S and self._view is not None and self._view.health is not Health.STARTING:
            return f"OLD: no news for {old:.0f} s"
        return self._remark if time.monotonic() < self._remark_until else ""

    def _say(self, remark: str) -> None:
        self._remark, self._remark_until = remark, time.monotonic() + REMARK_S
        self._show()

    # --- what a person does ---------------------------------------------------------------------------------

    def action_act(self, name: str) -> None:
        """Hand an event to the run."""
        if not self._ended:
            event = Event[name]
            self._source.act(event)
            self._say(f"asked to {event.value}")

    def action_ask_abort(self) -> None:
        if not self._ended:
            self._ask(Question.ABORT)

    def action_leave(self) -> None:
        if self._ended or self._outlives:
            self.exit()
        else:
            self._ask(Question.LEAVE_ANYWAY if self._aborting else Question.LEAVE)

    def action_interrupt(self) -> None:
        """Ctrl-C: ask whether to abort; when that is being asked, yes."""
        if self._ended:
            self.exit()
        elif self._question is not None:
            self.action_confirm()
        else:
            self._ask(Question.LEAVE_ANYWAY if self._aborting else Question.ABORT)

    def action_confirm(self) -> None:
        question, self._question = self._question, None
        if question is Question.LEAVE_ANYWAY:
            self.exit()
        elif question is not None and not self._ended:
            self._leaving = question is Question.LEAVE
            self._aborting = True
            self._source.act(Event.ABORT)
            self._say("asked to abort")

    def action_dismiss(self) -> None:
        self._question = None
        self._show()

    def _ask(self, question: Question) -> None:
        self._question = question
        self._show()
