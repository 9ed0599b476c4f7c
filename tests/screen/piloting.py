"""The watch screen driven by keys: what is on it, and waiting for what is to come."""

from __future__ import annotations

import asyncio
import string
import time
from collections.abc import Awaitable, Callable

from rich.style import Style
from textual.pilot import Pilot

from runner.screen.ink import DOTTED, Glyphs
from runner.screen.showing import Source
from runner.screen.watch import WatchApp
from tests.screen.scripted import showing

Step = Callable[[Pilot[None]], Awaitable[None]]
Look = Callable[[WatchApp], str]


def shown(app: WatchApp) -> str:
    """What is on the screen, as text."""
    strips = app.screen._compositor.render_strips()
    return "\n".join(strip.text.rstrip() for strip in strips) + "\n"


def painted(app: WatchApp) -> str:
    """What is on the screen, and in which ink: under each line a letter for each cell, blank for the plainest, and at
    the end what the letters stand for, in the order in which they come."""
    letters: dict[str, str] = {}
    lines = []
    for strip in app.screen._compositor.render_strips():
        inks = ""
        for segment in strip:
            ink = _ink(segment.style)
            letter = letters.setdefault(ink, string.ascii_letters[len(letters)]) if ink else " "
            inks += letter * segment.cell_length
        lines += [f"|{strip.text}|", f" {inks}".rstrip()]
    legend = [f"{letter}: {ink}" for ink, letter in letters.items()]
    return "\n".join([*(line for line in lines if line), *legend]) + "\n"


def _ink(style: Style | None) -> str:
    """A style in words: colors and what stresses; empty for the terminal's own."""
    if style is None:
        return ""
    grounds = [("", style.color), ("on ", style.bgcolor)]
    colors = [f"{on}{color.name}" for on, color in grounds if color is not None and not color.is_default]
    stress = [name for name in ("bold", "dim", "italic", "underline", "reverse") if getattr(style, name)]
    return " ".join([*colors, *stress])


def watched(
    source: Source,
    step: Step | None = None,
    size: tuple[int, int] = (80, 24),
    glyphs: Glyphs = DOTTED,
    read_only: bool = False,
    look: Look = shown,
) -> tuple[str, bool]:
    """Show the source, take the step, and return what was on the screen in the end, and whether it still runs."""

    async def run() -> tuple[str, bool]:
        app = WatchApp(showing(), source, glyphs, read_only)
        async with app.run_test(size=size) as pilot:
            await until(pilot, glyphs.rule * 2)
            if step is not None:
                await step(pilot)
            await settled(pilot)
            return look(app), app._exit is False

    return asyncio.run(run())


def pressing(*keys: str, wanted: str = "", first: str = "") -> Step:
    """Wait for a text, press keys one after another, wait for another text."""

    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, first)
        await pilot.press(*keys)
        await until(pilot, wanted)

    return step


async def until(pilot: Pilot[None], wanted: str, seconds: float = 20.0) -> None:
    """Wait until a text is on the screen, or the screen is gone."""
    app = pilot.app
    assert isinstance(app, WatchApp)
    end = time.monotonic() + seconds
    while app.is_running and app._exit is False and wanted not in shown(app):
        assert time.monotonic() < end, f"{wanted!r} did not appear:\n{shown(app)}"
        await pilot.pause(0.02)


async def settled(pilot: Pilot[None]) -> str:
    """The screen once three looks at it agree: its widgets repaint one by one."""
    app = pilot.app
    assert isinstance(app, WatchApp)
    looks = [""]
    while app.is_running and app._exit is False and (len(looks) < 4 or len(set(looks[-3:])) > 1):
        looks.append(shown(app))
        await pilot.pause(0.02)
    return looks[-1]
