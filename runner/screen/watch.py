"""The Textual program that shows a run while it goes on.

It pulls its source four times a second and shows what it is told. A key becomes a deed that is handed to the source
at once, and the line above the feed says how far it has come. Aborting takes two keystrokes, always. The run has a
process of its own: it goes on when the screen is left, suspended or killed.
"""

from __future__ import annotations

import os
import sys
import time
from collections import deque
from collections.abc import Callable
from typing import ClassVar

from textual.app import App, ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container
from textual.events import Click, Key, MouseScrollDown, MouseScrollUp, Resize
from textual.timer import Timer

from runner.host.messages import Deed
from runner.host.view import FeedLine, View
from runner.screen import pages, sight
from runner.screen.arrangement import HEADER_ROWS, Arrangement, arrange
from runner.screen.commands import BY_KEY, BY_NAME, COMMANDS, found, means_something
from runner.screen.desk import Desk
from runner.screen.floor_drawing import FloorDrawing
from runner.screen.footer import Mode, answers, feed, key_at, keys, rule
from runner.screen.header import header, held_by, lost_header
from runner.screen.ink import ASCII, DOTTED, Glyphs, Ink, Row, cut, faded
from runner.screen.outline import outline, summary
from runner.screen.painted import COLORLESS, LOOKS, FloorPanel, Panel
from runner.screen.recollection import Recollection
from runner.screen.showing import Showing, Source
from runner.screen.sight import Sight
from runner.screen.sparing import send_only_what_changed
from runner.screen.terminal import ascii_only
from runner.screen.words import is_lost, seconds_of

PULL_S = 0.25
FEED_KEPT = 500
_FOLLOWED_FROM = 2  # steps closer than the whole floor, from which it is worth going along


def watch(showing: Showing, source: Source, read_only: bool = False) -> bool:
    """Show the run until the person leaves. False where the screen itself broke, so that the caller can go on in
    plain lines; the run is not touched by that."""
    glyphs = ASCII if ascii_only(os.environ, sys.stderr.encoding) else DOTTED
    app = WatchApp(showing, source, glyphs, read_only)
    with send_only_what_changed():
        app.run(mouse=False)  # so that the terminal's own selecting and copying keep working until `m`
    return not app.return_code


class WatchApp(App[None]):
    """The screen of one run."""

    ENABLE_COMMAND_PALETTE = False
    CSS = """
    Screen { layout: vertical; overflow: hidden; }
    #body { overflow: hidden; }
    #page { display: none; }
    Slice { width: 1fr; height: 100%; }
    """
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("ctrl+c", "interrupt", "abort", priority=True),
        Binding("ctrl+q", "leave", "leave", priority=True),
        Binding("ctrl+z", "suspend_process", "suspend", priority=True),
    ]

    def __init__(self, showing: Showing, source: Source, glyphs: Glyphs, read_only: bool = False) -> None:
        super().__init__(ansi_color=True)
        looks = COLORLESS if self.no_color else LOOKS
        self._showing, self._source, self._glyphs, self._read_only = showing, source, glyphs, read_only
        self._drawing = FloorDrawing(showing.site, showing.robot, glyphs)
        self._arrangement = self._arrange(80, 24)
        self._sight = Sight()
        self._view: View | None = None
        self._lost = False
        self._feed: deque[FeedLine] = deque(maxlen=FEED_KEPT)
        self._kept = Recollection(showing.troubles, showing.way)
        self._desk = Desk()
        self._mode, self._page_at, self._choice = Mode.WATCHING, 0, pages.Choice()
        self._asked: tuple[str, tuple[str, ...]] = ("", ())
        self._mouse_on = False
        self._pulling: Timer | None = None
        self._header, self._steps, self._page = Panel(looks, "header"), Panel(looks, "steps"), Panel(looks, "page")
        self._rule, self._lines, self._keys = Panel(looks, "rule"), Panel(looks, "feed"), Panel(looks, "keys")
        self._floor = FloorPanel(looks)
        self._body = Container(self._floor, self._steps, id="body")
        self._does: dict[str, Callable[[], None]] = {
            "hold": lambda: self._do(Deed.HOLD),
            "release": lambda: self._do(Deed.RELEASE),
            "skip": lambda: self._do(Deed.SKIP),
            "answer": self._open_answers,
            "abort": lambda: self._turn_to(Mode.ABORTING),
            "closer": self._closer,
            "wider": lambda: self._look(sight.wider(self._sight, self._drawing.scale)),
            "whole": lambda: self._look(Sight()),
            "follow": self._follow,
            "up": lambda: self._move("up"),
            "mouse": self._switch_mouse,
            "copy": self._copy,
            "commands": self._list_commands,
            "help": self._help,
            "suspend": self.action_suspend_process,
            "leave": self.action_leave,
        }

    # --- layout ---------------------------------------------------------------------------------------------

    def compose(self) -> ComposeResult:
        yield from (self._header, self._body, self._page, self._rule, self._lines, self._keys)

    def on_resize(self, event: Resize) -> None:
        self._arrangement = arranged = self._arrange(event.size.width, event.size.height)
        self._header.styles.height = HEADER_ROWS
        self._rule.styles.height = self._keys.styles.height = 1
        self._lines.styles.height = arranged.feed_rows
        self._body.styles.layout = "vertical" if arranged.stacked else "horizontal"
        self._body.styles.height = self._page.styles.height = arranged.body_rows
        self._floor.styles.width, self._floor.styles.height = arranged.floor_columns, arranged.floor_rows
        self._floor.display = arranged.floor_rows > 0
        self._steps.styles.width, self._steps.styles.height = arranged.steps_columns, arranged.steps_rows
        self.call_after_refresh(self._redraw)

    def _arrange(self, columns: int, rows: int) -> Arrangement:
        return arrange(columns, rows, self._showing.site.width / self._showing.site.height)

    def _redraw(self) -> None:
        self._look(self._sight)
        self.pull()
        if self._pulling is None:  # nothing is shown before there is a place for it
            self._pulling = self.set_interval(PULL_S, self.pull)

    # --- what is shown --------------------------------------------------------------------------------------

    def pull(self) -> None:
        """Take what is new and show it."""
        now, view = time.monotonic(), self._source.view()
        for done in self._source.answers():
            self._desk.answered(done, now)
        self._feed.extend(lines := self._source.feed())
        self._kept.take_lines(lines)
        if view is not None and view != self._view:
            self._view = view
            self._kept.take(view)
        self._lost = is_lost(self._view, self._source.age())
        self._close_what_has_no_use()
        self._show()

    @property
    def _ended(self) -> bool:
        return self._view is not None and self._view.outcome is not None

    def _close_what_has_no_use(self) -> None:
        """A prompt that the run itself has overtaken is taken away."""
        view = self._view
        if self._mode is Mode.ABORTING and self._ended:
            self._turn_to(Mode.WATCHING)
        if self._mode is Mode.ANSWERING and (view is None or (view.question, view.answers) != self._asked):
            self._turn_to(Mode.WATCHING)
            self._say("the question is not open any more")

    def _show(self) -> None:
        width, arranged, glyphs = self.size.width, self._arrangement, self._glyphs
        self._header.show(self._top(width))
        if self._mode in (Mode.READING, Mode.CHOOSING):
            self._page.show(self._page_rows(width))
        else:
            if arranged.floor_rows:
                self._show_floor()
            self._steps.show(self._step_rows())
        remark = self._desk.remark(time.monotonic())
        self._rule.show([rule(width, glyphs, arranged.floor_rows > 0, bool(self._drawing.shut), remark)])
        if self._mode is Mode.ANSWERING:
            self._lines.show(answers(*self._asked, width, arranged.feed_rows, glyphs))
        else:
            self._lines.show(feed(self._feed, width, arranged.feed_rows, glyphs))
        self._keys.show([self._key_row()])

    def _top(self, width: int) -> tuple[Row, ...]:
        if self._lost and self._view is not None:
            return lost_header(self._view, self._source.age(), self._showing, width, self._glyphs)
        return header(self._view, self._showing, width, self._glyphs, held_by(self._view, self._feed))

    def _show_floor(self) -> None:
        view = self._view
        self._drawing.aim(view.place if view is not None else None)
        if view is not None:
            self._drawing.tell_time(seconds_of(view.clock))
            along = sight.going_along(self._sight, self._drawing.scale, self._robot())
            if along != self._sight:
                self._look(along)
        self._floor.show(self._drawing.still, self._drawing.moving(view, self._kept, self._lost))

    def _key_row(self) -> Row:
        return keys(self._view, self._mode, self._read_only, self.size.width, self._glyphs)

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
        shown: list[Row] = [((edge, Ink.FAINT), *row) for row in padded[:height]]
        return [faded(row) for row in shown] if self._lost else shown

    def _page_rows(self, width: int) -> list[Row]:
        height, glyphs = self._arrangement.body_rows, self._glyphs
        if self._mode is Mode.CHOOSING:
            return pages.choice_rows(self._choice, self._view, self._read_only, width, height, glyphs)
        rows = pages.help_rows(self._read_only, self._showing.run, width, glyphs)
        self._page_at = max(min(self._page_at, len(rows) - height), 0)
        return pages.scrolled(rows, self._page_at, height, glyphs)

    def _say(self, remark: str) -> None:
        self._desk.say(remark, time.monotonic())
        self._show()

    def _turn_to(self, mode: Mode) -> None:
        self._mode = mode
        page = mode in (Mode.READING, Mode.CHOOSING)
        if self._page.display and not page:
            self._floor.paint_anew()
        self._page.display, self._body.display = page, not page
        self._show()

    # --- keys and mouse -------------------------------------------------------------------------------------

    def on_key(self, event: Key) -> None:
        event.stop()
        match self._mode:
            case Mode.ABORTING:
                self._key_while_aborting(event.key)
            case Mode.ANSWERING:
                self._key_while_answering(event)
            case Mode.READING:
                self._key_while_reading(event.key)
            case Mode.CHOOSING:
                self._key_while_choosing(event)
            case Mode.WATCHING:
                self._key_while_watching(event.key)

    def _key_while_watching(self, key: str) -> None:
        if key in sight.ARROWS:
            self._move(key)
        elif key in BY_KEY:
            self._carry_out(BY_KEY[key])

    def _key_while_aborting(self, key: str) -> None:
        if key == "y":
            self._turn_to(Mode.WATCHING)
            self._do(Deed.ABORT)
        elif key in ("escape", "n"):
            self._turn_to(Mode.WATCHING)

    def _key_while_answering(self, event: Key) -> None:
        number = int(event.character) if event.character and event.character in "123456789" else 0
        if 0 < number <= len(self._asked[1]):
            self._turn_to(Mode.WATCHING)
            self._do(Deed.ANSWER, self._asked[1][number - 1])
        elif event.key == "escape":
            self._turn_to(Mode.WATCHING)
        elif event.key == "a":  # an abort is never farther than two keys
            self._turn_to(Mode.ABORTING)

    def _key_while_reading(self, key: str) -> None:
        if key in ("escape", "q", "question_mark"):
            self._turn_to(Mode.WATCHING)
        elif key in ("up", "down"):
            self._page_at += 1 if key == "down" else -1
            self._show()
        elif key == "a":
            self._turn_to(Mode.WATCHING)
            self._carry_out("abort")

    def _key_while_choosing(self, event: Key) -> None:
        if event.key == "escape":
            self._turn_to(Mode.WATCHING)
        elif event.key == "enter":
            command = pages.chosen(self._choice, self._view, self._read_only)
            self._turn_to(Mode.WATCHING)
            if command is not None:
                self._carry_out(command.name)
        else:
            self._change_choice(event)
            self._show()

    def _change_choice(self, event: Key) -> None:
        if event.key in ("up", "down"):
            count = len(found(self._choice.typed, self._view, self._read_only))
            self._choice = self._choice.moved(1 if event.key == "down" else -1, count)
        elif event.key == "backspace":
            self._choice = self._choice.less()
        elif event.character and event.character.isprintable():
            self._choice = self._choice.typing(event.character)

    def _carry_out(self, name: str) -> None:
        if means_something(BY_NAME[name], self._view, self._read_only):
            self._does[name]()
        elif BY_NAME[name].acts and self._read_only:
            self._say("this screen is only for looking")

    def on_click(self, event: Click) -> None:
        x, y = event.screen_x, event.screen_y
        if y == self.size.height - 1:
            self._press(key_at(self._key_row(), x))
        elif self._floor.display and self._body.display and self._floor.region.contains(x, y):
            at = sight.point_at(self._drawing.scale, x - self._floor.region.x, y - self._floor.region.y)
            self._look(sight.closer(self._sight, self._drawing.scale, at))

    def _press(self, cap: str) -> None:
        """What a key in the footer does when it is touched."""
        named = {command.cap: command.key for command in COMMANDS} | {"y": "y", "Esc": "escape"}
        if cap in named:
            self.simulate_key(named[cap])

    def on_mouse_scroll_up(self, _: MouseScrollUp) -> None:
        self._closer()

    def on_mouse_scroll_down(self, _: MouseScrollDown) -> None:
        self._look(sight.wider(self._sight, self._drawing.scale))

    # --- what a person does ---------------------------------------------------------------------------------

    def _do(self, deed: Deed, text: str = "") -> None:
        """Hand a deed to the run."""
        self._desk.sent(self._source.do(deed, text), deed, text, time.monotonic())
        self._show()

    def _open_answers(self) -> None:
        if self._view is not None and self._view.question is not None:
            self._asked = (self._view.question, self._view.answers)
            self._turn_to(Mode.ANSWERING)

    def action_leave(self) -> None:
        self.exit()

    def action_interrupt(self) -> None:
        """Ctrl-C: ask whether to abort; when that is being asked, yes. Where nothing can be aborted it leaves."""
        if self._ended or self._read_only or self._view is None:
            self.exit()
        elif self._mode is Mode.ABORTING:
            self._key_while_aborting("y")
        else:
            self._turn_to(Mode.ABORTING)

    def _look(self, wanted: Sight) -> None:
        """Look at another part of the floor."""
        self._sight = wanted
        if self._arrangement.floor_rows:
            self._drawing.resize(self._arrangement.floor_columns, self._arrangement.floor_rows, wanted)
            self._floor.show(self._drawing.still, self._drawing.moving(self._view, self._kept, self._lost))

    def _robot(self) -> tuple[float, float] | None:
        pose = self._view.pose if self._view is not None else None
        return None if pose is None else (pose.x, pose.y)

    def _closer(self) -> None:
        at = self._robot() if self._sight.follows else None
        self._look(sight.closer(self._sight, self._drawing.scale, at))

    def _follow(self) -> None:
        self._look(Sight(max(self._sight.level, _FOLLOWED_FROM), self._robot(), True))

    def _move(self, key: str) -> None:
        if self._sight.level == 0:
            self._say("the whole floor is in sight: + shows it from closer")
        self._look(sight.moved(self._sight, self._drawing.scale, *sight.ARROWS[key]))

    def _switch_mouse(self) -> None:
        """The driver's own switch. Where it has none, the mouse stays with the terminal."""
        driver, wanted = self._driver, not self._mouse_on
        name = "_enable_mouse_support" if wanted else "_disable_mouse_support"
        if driver is None or not hasattr(driver, name):
            self._say("this terminal has no mouse")
            return
        driver._mouse = True
        getattr(driver, name)()
        self._mouse_on = wanted
        self._say("mouse on: touch keys and floor" if wanted else "mouse off: the terminal selects text")

    def _copy(self) -> None:
        self.copy_to_clipboard(self._showing.report_hint)
        self._say(f"copied: {self._showing.report_hint}")

    def _list_commands(self) -> None:
        self._choice = pages.Choice()
        self._turn_to(Mode.CHOOSING)

    def _help(self) -> None:
        self._page_at = 0
        self._turn_to(Mode.READING)
