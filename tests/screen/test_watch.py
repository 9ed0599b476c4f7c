"""How the watch screen looks, against a source that replays a written run.

Golden pictures are in tests/screen/golden; with TRUNDLE_WRITE_GOLDEN=1 they are written anew, to be looked at, and so
are the pictures that README shows.
"""

from __future__ import annotations

import asyncio
import os
import re
from dataclasses import replace
from pathlib import Path

import pytest
from textual.pilot import Pilot

from runner.host.view import View
from runner.screen.ink import ASCII, DOTTED, Glyphs
from runner.screen.watch import WatchApp
from tests.screen.piloting import painted, pressing, settled, until, watched
from tests.screen.scripted import ENDED, HELD, MOVING, Replay, driving, scene, showing

GOLDEN = Path(__file__).parent / "golden"
PICTURES = Path(__file__).parents[2] / "runner" / "screen" / "pictures"
APPROVED = ("moving", "recovering", "held", "needs-you", "lost", "ended")
LOOKS = ("color", "plain", "ascii")
COLORS = ("red", "green", "yellow", "blue", "magenta", "cyan", "white", "black")
RULES = re.compile(r"\.r(\d+) \{ ([^}]*) \}")


def _svg(name: str, size: tuple[int, int], glyphs: Glyphs = DOTTED) -> str:
    """The screen as a vector picture, after it has settled."""

    async def run() -> str:
        app = WatchApp(showing(), scene(name), glyphs)
        async with app.run_test(size=size) as pilot:
            await until(pilot, glyphs.rule * 2)
            await settled(pilot)
            return app.export_screenshot(title="trundle watch")

    return asyncio.run(run())


@pytest.mark.parametrize("look", LOOKS)
@pytest.mark.parametrize(("columns", "rows"), [(80, 24), (120, 40), (60, 20)])
@pytest.mark.parametrize("name", APPROVED)
def test_the_screen_looks_as_it_was_approved(
    name: str, columns: int, rows: int, look: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    if look != "color":
        monkeypatch.setenv("NO_COLOR", "1")
    glyphs = ASCII if look == "ascii" else DOTTED
    picture, _ = watched(scene(name), size=(columns, rows), glyphs=glyphs, look=painted)
    path = GOLDEN / f"{name}-{columns}x{rows}-{look}.txt"
    if os.environ.get("TRUNDLE_WRITE_GOLDEN"):
        path.write_text(picture, encoding="utf-8")
    assert picture == path.read_text(encoding="utf-8")
    assert look != "ascii" or picture.isascii()
    legend = [line for line in picture.splitlines() if line[1:3] == ": "]
    colored = any(word in COLORS for line in legend for word in line.split())
    assert colored == (look == "color") or (name == "lost" and not colored)


@pytest.mark.parametrize("name", APPROVED)
@pytest.mark.parametrize("size", ["80x24", "120x40", "60x20"])
def test_without_color_the_screen_says_the_same(name: str, size: str) -> None:
    colored, plain = ((GOLDEN / f"{name}-{size}-{look}.txt").read_text("utf-8") for look in ("color", "plain"))
    said = [[line for line in picture.splitlines() if line.startswith("|")] for picture in (colored, plain)]
    assert said[0] == said[1]


@pytest.mark.parametrize("name", APPROVED)
def test_without_color_a_picture_of_the_screen_is_gray(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    colored = _svg(name, (80, 24))
    monkeypatch.setenv("NO_COLOR", "1")
    assert all(map(_is_gray, _fills(_svg(name, (80, 24)))))
    assert name == "lost" or not all(map(_is_gray, _fills(colored)))


def _fills(picture: str) -> set[str]:
    """The colors that letters and grounds of a picture have."""
    drawn = picture[picture.index('<g transform="translate(9') :]
    letters = {fill for _, rule in RULES.findall(picture) for fill in re.findall(r"fill: (#[0-9a-f]{6})", rule)}
    return letters | set(re.findall(r'<rect fill="(#[0-9a-f]{6})"', drawn))


def _is_gray(color: str) -> bool:
    parts = [int(color[at : at + 2], 16) for at in (1, 3, 5)]
    return max(parts) - min(parts) <= 8


@pytest.mark.parametrize("name", ["moving", "needs-you", "lost"])
def test_the_pictures_that_are_shown_to_newcomers_are_of_this_screen(name: str) -> None:
    path = PICTURES / f"{name}.svg"
    drawn = re.sub(r"terminal-\d+", "terminal", _svg(name, (100, 30)))
    if os.environ.get("TRUNDLE_WRITE_GOLDEN"):
        PICTURES.mkdir(exist_ok=True)
        path.write_text(drawn, encoding="utf-8")
    assert drawn == path.read_text(encoding="utf-8")


def test_the_robot_moves_and_what_it_left_is_restored() -> None:
    source = Replay([replace(MOVING, pose=None, route=(), obstacles=())])

    async def step(pilot: Pilot[None]) -> None:
        for view in (driving()[20], driving()[60], MOVING):
            source.views = [view]
            await until(pilot, view.clock)

    text, _ = watched(source, step)
    robots = [char for line in text.splitlines()[3:18] for char in line[:56] if char in DOTTED.heading]
    assert robots == ["→"]
    still, _ = watched(Replay([MOVING]))
    differs = {a for a, b in zip(text, still, strict=True) if a != b}
    assert differs <= {chr(0x2800 + bits) for bits in range(256)} | {DOTTED.before}


def test_a_floor_that_was_hidden_by_the_help_shows_what_is_so_now() -> None:
    source = Replay([driving()[20]])

    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, driving()[20].clock)
        await pilot.press("question_mark")
        source.views = [MOVING]
        await until(pilot, MOVING.clock)
        await pilot.press("escape")
        await until(pilot, "lift◦")

    text, _ = watched(source, step)
    robots = [char for line in text.splitlines()[3:18] for char in line[:56] if char in DOTTED.heading]
    assert robots == ["→"]


def test_a_new_size_is_filled_at_once() -> None:
    async def step(pilot: Pilot[None]) -> None:
        await pilot.resize_terminal(40, 12)
        await until(pilot, " MOVING ")
        await pilot.resize_terminal(120, 40)
        await until(pilot, "M O V I N G")
        await until(pilot, "lift◦")

    text, _ = watched(Replay([MOVING]), step)
    assert text == watched(Replay([MOVING]), size=(120, 40))[0]


@pytest.mark.parametrize(("columns", "rows"), [(40, 16), (50, 40), (20, 8), (300, 90)])
def test_odd_sizes_still_tell_health_step_and_keys(columns: int, rows: int) -> None:
    text, running = watched(Replay([HELD]), size=(columns, rows))
    assert running
    assert "HELD" in text.replace(" ", "")
    assert "go to laboratory" in " ".join(text.split()) or columns < 30
    assert "r release" in " ".join(text.split())


def test_a_run_that_has_not_shown_itself_yet_is_starting() -> None:
    no_views: list[View] = []
    text, _ = watched(Replay(no_views))
    assert "S T A R T I N G" in text


def test_old_news_are_said_to_be_old_and_look_old() -> None:
    text, _ = watched(scene("lost"))
    assert "N O  N E W S   for 0:47, since 03:12:22" in text
    assert "keeps trying" in text
    floor = [line[:57] for line in text.splitlines()[3:18]]
    assert any(DOTTED.old_robot in line for line in floor)
    assert not any(char in DOTTED.heading for line in floor for char in line)


def test_when_news_come_again_they_are_shown_as_new() -> None:
    source = scene("lost")

    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "N O  N E W S")
        source.silent = 0.1
        await until(pilot, "M O V I N G")

    text, _ = watched(source, step)
    assert "N E W S" not in text
    assert "keeps trying" not in text


def test_a_run_whose_process_died_says_how_to_go_on_with_it() -> None:
    dead = replace(ENDED, outcome="broken off", reason="no process owns this run any more")
    text, _ = watched(Replay([dead], age=500.0))
    assert "E N D E D   broken off" in text
    assert "trundle pick-up evening-0312" in text


def test_when_the_run_has_ended_the_screen_stays_and_no_key_acts() -> None:
    source = Replay([ENDED])
    text, running = watched(source, pressing("a", "h", "y", "s", "r", "enter"))
    assert running
    assert source.done == []
    assert "completed" in text
    assert "trundle report evening-0312" in text


def test_where_the_screen_has_big_room_the_floor_has_it() -> None:
    text, _ = watched(Replay([MOVING]), size=(200, 60))
    lines = text.splitlines()
    assert sum("▬" in line for line in lines) >= 1
    assert max(line.find("│ Evening") for line in lines) > 130
