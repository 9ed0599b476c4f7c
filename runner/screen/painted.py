"""The two widgets the screen is made of. Both repaint only what changed since the last time.

Textual sends a refreshed region from the widget's left edge on, and it compares nothing with what the terminal already
shows. So a panel compares its rows itself, and the floor is cut into slices side by side, each of which refreshes only
the rows in which one of its cells changed.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

from rich.segment import Segment
from rich.style import Style
from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.geometry import Region
from textual.strip import Strip
from textual.widget import Widget

from runner.screen.floor_drawing import Drawn, Spot
from runner.screen.ink import Ink, Row

_SLICES = 10
"""More slices send less for each change, and cost more for each widget."""

LOOKS: dict[Ink, Style] = {
    ink: Style.parse(look)
    for ink, look in {
        Ink.TEXT: "default on default",
        Ink.FAINT: "dim default on default",
        Ink.STRONG: "bold default on default",
        Ink.CURRENT: "bold reverse default on default",
        Ink.NOTICE: "bold default on default",
        Ink.TROUBLE: "bold magenta on default",
        Ink.KEY: "bold reverse default on default",
        Ink.QUESTION: "bold reverse default on default",
        Ink.WALL: "default on default",
        Ink.FURNITURE: "dim default on default",
        Ink.DOOR: "default on default",
        Ink.PLACE: "default on default",
        Ink.GOAL: "bold underline default on default",
        Ink.ROUTE: "bold cyan on default",
        Ink.SENSED: "bold magenta on default",
        Ink.ROBOT: "bold reverse default on default",
        Ink.TRAIL: "dim default on default",
        Ink.BEFORE: "dim magenta on default",
        Ink.SPREAD: "dim cyan on default",
        Ink.STUCK: "bold reverse magenta on default",
        Ink.SHUT: "bold default on default",
        Ink.OLD: "dim default on default",
        Ink.LOST: "bold reverse default on default",
        Ink.STARTING: "bold reverse default on default",
        Ink.MOVING: "bold black on cyan",
        Ink.WAITING: "bold reverse default on default",
        Ink.RECOVERING: "bold black on white",
        Ink.HELD: "bold black on yellow",
        Ink.NEEDS_YOU: "bold white on magenta",
        Ink.ENDED: "bold reverse default on default",
    }.items()
}
"""The terminal's own 16 colors, so that its theme is kept. No meaning hangs on a color alone."""

COLORLESS: dict[Ink, Style] = {
    ink: Style(
        bold=look.bold,
        dim=look.dim,
        underline=look.underline,
        reverse=look.reverse or look.bgcolor not in (None, LOOKS[Ink.TEXT].bgcolor),
        color="default",
        bgcolor="default",
    )
    for ink, look in LOOKS.items()
}
"""The same without any color: a colored ground becomes reverse video."""


class Panel(Widget):
    """Rows of text, told what to show."""

    def __init__(self, looks: Mapping[Ink, Style], panel_id: str) -> None:
        super().__init__(id=panel_id)
        self._looks = looks
        self._rows: list[Row] = []

    def show(self, rows: Sequence[Row]) -> None:
        """Replace the rows; only those that differ are sent to the terminal."""
        before, self._rows = self._rows, list(rows)
        for line in range(max(len(before), len(rows))):
            if before[line : line + 1] != self._rows[line : line + 1]:
                self.refresh(Region(0, line, self.size.width, 1))

    def render_line(self, y: int) -> Strip:
        row = self._rows[y] if y < len(self._rows) else ()
        strip = Strip([Segment(text, self._looks[ink]) for text, ink in row])
        return strip.adjust_cell_length(self.size.width, self._looks[Ink.TEXT])


class Slice(Widget):
    """Some columns of the floor, over its full height."""

    def __init__(self, floor: FloorPanel) -> None:
        super().__init__()
        self._floor = floor

    @property
    def first_column(self) -> int:
        """Of the floor's columns, the one at this slice's left edge."""
        return self.region.x - self._floor.region.x

    def redraw(self, changed: Iterable[Spot]) -> None:
        """Refresh, in each row that has changed cells in this slice, the stretch up to the last of them."""
        first, width = self.first_column, self.size.width
        ends: dict[int, int] = {}
        for row, column in changed:
            if first <= column < first + width:
                ends[row] = max(ends.get(row, 0), column - first + 1)
        if ends:
            self.refresh(*(Region(0, row, end, 1) for row, end in ends.items()))

    def render_line(self, y: int) -> Strip:
        return self._floor.strip(y, self.first_column, self.size.width)


class FloorPanel(Horizontal):
    """The floor: a still layer, and a layer of few cells that move."""

    def __init__(self, looks: Mapping[Ink, Style]) -> None:
        super().__init__(id="floor")
        self._looks = looks
        self._still: list[list[Drawn]] = []
        self._moving: dict[Spot, Drawn] = {}

    def compose(self) -> ComposeResult:
        for _ in range(_SLICES):
            yield Slice(self)

    def show(self, still: list[list[Drawn]], moving: dict[Spot, Drawn]) -> None:
        """Replace both layers: only the stretches of rows that changed are drawn anew."""
        changed = self._changed(still, moving)
        self._still, self._moving = still, moving
        if changed:
            for part in self.query(Slice):
                part.redraw(changed)

    def paint_anew(self) -> None:
        """Draw everything anew, because it was hidden: of what changes meanwhile, nothing is drawn."""
        for part in self.query(Slice):
            part.refresh()

    def _changed(self, still: list[list[Drawn]], moving: dict[Spot, Drawn]) -> list[Spot]:
        before = self._moving
        changed = [spot for spot in before.keys() | moving.keys() if before.get(spot) != moving.get(spot)]
        if still is not self._still:
            changed += [
                (row, column)
                for row, cells in enumerate(still)
                for column, cell in enumerate(cells)
                if self._at_rest(row, column) != cell
            ]
        return changed

    def _at_rest(self, row: int, column: int) -> Drawn | None:
        cells = self._still[row] if row < len(self._still) else []
        return cells[column] if column < len(cells) else None

    def strip(self, y: int, first: int, width: int) -> Strip:
        """A stretch of a row, as runs of one look each."""
        if y >= len(self._still):
            return Strip.blank(width, self._looks[Ink.TEXT])
        still = self._still[y]
        segments: list[Segment] = []
        for column in range(first, min(first + width, len(still))):
            char, ink = self._moving.get((y, column), still[column])
            segments.append(Segment(char, self._looks[ink]))
        return Strip(Segment.simplify(segments)).adjust_cell_length(width, self._looks[Ink.TEXT])
