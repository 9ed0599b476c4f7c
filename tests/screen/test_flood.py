"""More news than anybody reads leave the screen responsive, and its memory flat."""

from __future__ import annotations

import time
import tracemalloc
from dataclasses import replace
from pathlib import Path

from textual.pilot import Pilot

from runner.host.remote import RemoteSource
from runner.host.view import FeedLine, Weight
from runner.machine.table import Event
from tests.screen.hosted import hosted
from tests.screen.piloting import until, watched
from tests.screen.scripted import MOVING, driving

EVENTS = 10_000
BURSTS = 20
GROWTH_MOST = 3_000_000
"""Bytes that the second half may add: far less than its lines, views and points take together."""


def test_ten_thousand_events_leave_the_screen_responsive_and_its_memory_flat(tmp_path: Path) -> None:
    """In far less than the minute that it may take."""
    views = driving()
    sizes: list[int] = []

    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        for burst in range(BURSTS):
            for number in range(burst * EVENTS // BURSTS, (burst + 1) * EVENTS // BURSTS):
                line = FeedLine(
                    number, "03:00:00", list(Weight)[number % 3], f"event {number} " * 5, (number % 45, 12.0)
                )
                host.board.post_line(line)
                host.show(replace(views[number % len(views)], stamp=float(number)))
            await pilot.pause(0.1)
            sizes.append(tracemalloc.get_traced_memory()[0])
        await until(pilot, f"event {EVENTS - 1}")
        pressed = time.monotonic()
        await pilot.press("h")
        await until(pilot, "H E L D")
        assert time.monotonic() - pressed < 10.0

    with hosted(tmp_path / "run", MOVING) as host, RemoteSource(host.folder) as source:
        tracemalloc.start()
        try:
            watched(source, step)
        finally:
            tracemalloc.stop()
    assert [event for event, _, _ in host.received] == [Event.HOLD]
    assert sizes[-1] - sizes[len(sizes) // 2] < GROWTH_MOST
