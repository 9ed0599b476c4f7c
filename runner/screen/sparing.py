"""Less on a thin line: of a row that changed, only the cells that changed are sent.

Textual (8.2) sends a changed region of a row from the left edge of its widget on, and crops it on the right only. Here
it is cropped on both sides, for as long as a screen is shown. That reaches into Textual, so it is tried out first on a
row of known content; a version that works otherwise is left as it is, and costs some bytes more.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from io import StringIO

from rich.console import Console
from rich.control import Control
from rich.segment import Segment
from rich.style import Style
from textual import _compositor
from textual.strip import Strip


@contextmanager
def send_only_what_changed() -> Iterator[None]:
    """Send less, in this process, for as long as the `with` lasts."""
    update = getattr(_compositor, "ChopsUpdate", None)
    before: Callable[..., str] | None = getattr(update, "render_segments", None)
    if update is None or before is None or not _works(update):
        yield
        return
    update.render_segments = _render
    try:
        yield
    finally:
        update.render_segments = before


def _render(update: _compositor.ChopsUpdate, console: Console) -> str:
    """The escape sequences of an update: of each strip the stretch between the two ends of what changed."""
    sequences: list[str] = []
    for y, first, end in update.spans:
        for strip_end, (x, strip) in zip(update.chop_ends[y], update.chops[y].items(), strict=False):
            if strip is None or x > end or strip_end <= first:
                continue
            left, right = max(x, first), min(strip_end, end)
            if left < right:
                sequences.append(Control.move_to(left, y).segment.text)
                sequences.append(strip.crop(left - x, right - x).render(console))
    return "".join(sequences)


def _works(update: type[_compositor.ChopsUpdate]) -> bool:
    """Whether an update is still made of what it is taken to be made of."""
    console = Console(file=StringIO(), force_terminal=True, color_system="standard", width=20)
    strip = Strip([Segment("abcdefghij", Style())])
    try:
        made = update([{0: strip}], [(0, 3, 5)], [[10]])
        return _render(made, console) == Control.move_to(3, 0).segment.text + "de"
    except (AttributeError, TypeError, ValueError, LookupError):
        return False
