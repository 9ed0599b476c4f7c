"""The watch screen driven by keys, against a source that replays a written run.

Golden pictures are in tests/screen/golden; with TRUNDLE_WRITE_GOLDEN=1 they are written anew, to be looked at.
"""

from __future__ import annotations

import asyncio
import os
import time
from collections.abc import Awaitable, Callable
from pathlib import Path

import pytest
from textual.pilot import Pilot

from runner.host.view import View
from runner.machine.table import Event
from runner.screen.ink import ASCII, DOTTED, Glyphs
from runner.screen.watch import WatchApp
from tests.screen.scripted import ENDED, HELD, MOVING, SCENES, Replay, driving, showing

GOLDEN = Path(__file__).parent / "golden"
Step = Callable[[Pilot[None]], Awaitable[None]]


def _shown(app: WatchApp) -> str:
    """What is on the screen, as text."""
    strips = app.screen._compositor.render_strips()
    return "\n".join(strip.text.rstrip() for strip in strips) + "\n"


def _watched(
    source: Replay, step: Step | None = None, size: tuple[int, int] = (80, 24), glyphs: Glyphs = DOTTED
) -> tuple[str, bool]:
    """Show the source, take the step, and return what was on the screen in the end, and whether it still runs."""

    async def run() -> tuple[str, bool]:
        app = WatchApp(showing(), source, glyphs)
        async with app.run_test(size=size) as pilot:
            await _until(pilot, glyphs.rule * 2)
            if step is not None:
                await step(pilot)
            return await _settled(pilot), app._exit is False

    return asyncio.run(run())


async def _until(pilot: Pilot[None], wanted: str, seconds: float = 20.0) -> None:
    """Wait until a text is on the screen, or the screen is gone."""
    app = pilot.app
    assert isinstance(app, WatchApp)
    end = time.monotonic() + seconds
    while app.is_running and app._exit is False and wanted not in _shown(app):
        assert time.monotonic() < end, f"{wanted!r} did not appear:\n{_shown(app)}"
        await pilot.pause(0.02)


async def _settled(pilot: Pilot[None]) -> str:
    """The screen once three looks at it agree: its widgets repaint one by one."""
    app = pilot.app
    assert isinstance(app, WatchApp)
    looks = [""]
    while app.is_running and app._exit is False and (len(looks) < 4 or len(set(looks[-3:])) > 1):
        looks.append(_shown(app))
        await pilot.pause(0.02)
    return looks[-1]


def _pressing(*keys: str, until: str = "") -> Step:
    async def step(pilot: Pilot[None]) -> None:
        await pilot.press(*keys)
        await _until(pilot, until)

    return step


@pytest.mark.parametrize(("columns", "rows"), [(80, 24), (120, 40), (60, 20)])
@pytest.mark.parametrize("scene", sorted(SCENES))
def test_the_screen_looks_as_it_was_approved(scene: str, columns: int, rows: int) -> None:
    glyphs = ASCII if columns == 60 else DOTTED
    text, _ = _watched(Replay([SCENES[scene]]), size=(columns, rows), glyphs=glyphs)
    path = GOLDEN / f"{scene}-{columns}x{rows}.txt"
    if os.environ.get("TRUNDLE_WRITE_GOLDEN"):
        path.write_text(text, encoding="utf-8")
    assert text == path.read_text(encoding="utf-8")


@pytest.mark.parametrize(("key", "event"), [("h", Event.HOLD), ("r", Event.RELEASE), ("s", Event.SKIP)])
def test_hold_release_and_skip_take_one_key(key: str, event: Event) -> None:
    source = Replay([MOVING])
    text, running = _watched(source, _pressing(key))
    assert source.acts == [event]
    assert f"asked to {event.value}" in text
    assert running


def test_what_was_asked_for_is_seen_in_the_next_view() -> None:
    text, _ = _watched(Replay([MOVING]), _pressing("h", until="H E L D"))
    assert "your turn: r releases" in text
    assert "H E L D" in text
    assert "r  release" in text
    assert "Operator: hold." in text


@pytest.mark.parametrize("keys", [("a", "y"), ("ctrl+c", "ctrl+c"), ("a", "ctrl+c"), ("ctrl+c", "y")])
def test_abort_takes_two_keys_and_the_screen_stays_with_the_outcome(keys: tuple[str, str]) -> None:
    source = Replay([MOVING])
    text, running = _watched(source, _pressing(*keys, until="E N D E D"))
    assert source.acts == [Event.ABORT]
    assert running
    assert "E N D E D   aborted" in text
    assert "trundle report evening-0312" in text


@pytest.mark.parametrize("key", ["a", "ctrl+c"])
def test_abort_asks_first_and_does_nothing_until_it_is_confirmed(key: str) -> None:
    source = Replay([MOVING])
    text, _ = _watched(source, _pressing(key, key if key == "a" else "h"))
    assert "Abort the run? The robot halts." in text
    assert Event.ABORT not in source.acts


@pytest.mark.parametrize("question", ["a", "q", "ctrl+c"])
def test_escape_takes_a_question_back(question: str) -> None:
    source = Replay([MOVING])
    text, running = _watched(source, _pressing(question, "escape", "y"))
    assert source.acts == []
    assert running
    assert "a  abort" in text


def test_leaving_a_run_under_way_asks_and_then_aborts_and_leaves() -> None:
    source = Replay([MOVING])
    text, running = _watched(source, _pressing("q"))
    assert "The run is still under way." in text
    assert running
    assert source.acts == []
    _, running = _watched(source, _pressing("q", "y", until="never shown: it leaves"))
    assert source.acts == [Event.ABORT]
    assert not running


def test_a_robot_that_does_not_answer_an_abort_does_not_trap_the_person() -> None:
    class Deaf(Replay):
        def act(self, event: Event) -> None:
            self.acts.append(event)

    source = Deaf([MOVING])
    text, running = _watched(source, _pressing("q", "y", "q"))
    assert "The abort has not come through yet." in text
    assert running
    _, running = _watched(source, _pressing("a", "y", "ctrl+c", "y"))
    assert not running


@pytest.mark.parametrize("key", ["q", "ctrl+c", "ctrl+q"])
def test_when_the_run_has_ended_one_key_leaves_and_no_other_acts(key: str) -> None:
    source = Replay([ENDED])
    text, running = _watched(source, _pressing("a", "h", "y", "s", "r"))
    assert running
    assert "completed" in text
    _, running = _watched(source, _pressing(key))
    assert not running
    assert source.acts == []


def test_a_question_that_the_end_of_the_run_has_answered_is_taken_away() -> None:
    source = Replay([MOVING])

    async def step(pilot: Pilot[None]) -> None:
        await pilot.press("a")
        source.views = [ENDED]
        await _until(pilot, "E N D E D")

    text, _ = _watched(source, step)
    assert "Abort" not in text
    assert "q  leave" in text


def test_the_robot_moves_and_what_it_left_is_restored() -> None:
    views = driving()
    source = Replay(views[:1])

    async def step(pilot: Pilot[None]) -> None:
        for view in (views[20], views[60], MOVING):
            source.views = [view]
            await _until(pilot, view.clock)

    text, _ = _watched(source, step)
    assert text == _watched(Replay([MOVING]))[0]


def test_a_new_size_is_filled_at_once() -> None:
    async def step(pilot: Pilot[None]) -> None:
        await pilot.resize_terminal(40, 12)
        await _until(pilot, " MOVING ")
        await pilot.resize_terminal(120, 40)
        await _until(pilot, "M O V I N G")
        await _until(pilot, "lift◦")

    text, _ = _watched(Replay([MOVING]), step)
    assert text == _watched(Replay([MOVING]), size=(120, 40))[0]


@pytest.mark.parametrize(("columns", "rows"), [(40, 16), (50, 40), (20, 8), (300, 90)])
def test_odd_sizes_still_tell_health_step_and_keys(columns: int, rows: int) -> None:
    text, running = _watched(Replay([HELD]), size=(columns, rows))
    assert running
    assert "HELD" in text.replace(" ", "")
    assert "go to laboratory" in " ".join(text.split()) or columns < 30
    assert "r release" in " ".join(text.split())


def test_a_run_that_has_not_shown_itself_yet_is_starting() -> None:
    no_views: list[View] = []
    text, _ = _watched(Replay(no_views))
    assert "S T A R T I N G" in text


def test_old_news_is_said_to_be_old(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("runner.screen.watch.OLD_AFTER_S", 0.0)
    text, _ = _watched(Replay([MOVING]), _pressing(until="OLD"))
    assert "OLD: no news for" in text


def test_a_run_whose_host_has_failed_is_not_shown_as_going_on() -> None:
    async def run() -> str:
        app = WatchApp(showing(), Replay([MOVING]), DOTTED, over=lambda: True)
        async with app.run_test(size=(80, 24)) as pilot:
            await _until(pilot, "E N D E D   broke off")
            await pilot.press("a", "y")
            return await _settled(pilot)

    assert "what ran it has failed" in asyncio.run(run())
