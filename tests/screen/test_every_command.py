"""Each command there is, by its key and from the list of commands: what reaches the host, and what is seen then.

The table must name every command, and every key that is bound beside the table of commands, so that a new one without
an entry here fails.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest
from textual.binding import Binding
from textual.events import MouseScrollDown, MouseScrollUp
from textual.pilot import Pilot

from runner.host.remote import RemoteSource, person
from runner.host.view import View
from runner.machine.table import Event
from runner.screen.commands import BY_NAME
from runner.screen.watch import WatchApp
from tests.screen.hosted import Hosted, hosted
from tests.screen.piloting import Step, settled, until, watched
from tests.screen.scripted import HELD, MOVING, NEEDS_YOU

CLOSE = ("plus", "plus", "plus")


@dataclass(frozen=True)
class Effect:
    """`first` is pressed before the command and `then` after it; `seen` judges the screens before and after."""

    seen: Callable[[str, str], bool]
    received: tuple[tuple[Event, str], ...] = ()
    view: View = MOVING
    first: tuple[str, ...] = ()
    then: tuple[str, ...] = ()
    leaves: bool = False


def places(screen: str) -> int:
    """How many places are in sight on the floor."""
    return screen.count("◦") + screen.count("●")


EFFECTS = {
    "answer": Effect(
        lambda _, after: f"answered by {person()}" in after, ((Event.ANSWERED, "no"),), NEEDS_YOU, then=("2",)
    ),
    "hold": Effect(lambda _, after: "H E L D" in after, ((Event.HOLD, ""),)),
    "release": Effect(lambda _, after: "M O V I N G" in after, ((Event.RELEASE, ""),), HELD),
    "skip": Effect(lambda _, after: "skip: no effect now" in after, ((Event.SKIP, ""),)),
    "abort": Effect(lambda _, after: "E N D E D   aborted" in after, ((Event.ABORT, ""),), then=("y",)),
    "closer": Effect(lambda before, after: places(after) < places(before)),
    "wider": Effect(lambda before, after: places(after) > places(before), first=("plus",)),
    "whole": Effect(lambda before, after: places(after) > places(before) and "lift◦" in after, first=CLOSE),
    "follow": Effect(lambda before, after: places(after) < places(before) and "→" in after),
    "up": Effect(lambda before, after: after != before and "◦charging bay" not in after, first=CLOSE),
    "mouse": Effect(lambda _, after: "this terminal has no mouse" in after),
    "copy": Effect(lambda _, after: "copied: trundle report evening-0312" in after),
    "commands": Effect(lambda _, after: "command: _" in after),
    "help": Effect(lambda _, after: "see more of the floor" in after and "Esc  back" in after),
    "suspend": Effect(lambda before, after: after == before),
    "leave": Effect(lambda _, after: after == "", leaves=True),
}
"""What each does. A terminal that cannot be given back is not suspended: the real one is in test_real_terminal."""

ARROWS = ("left", "right", "up", "down")
BOUND = {"ctrl+c": "abort", "ctrl+q": "leave", "ctrl+z": "suspend"}
"""Keys beside those of the table, and which command they are another way to."""
FROM_THE_LIST = [name for name in EFFECTS if name != "commands"]


@pytest.fixture
def host(tmp_path: Path) -> Iterator[Hosted]:
    with hosted(tmp_path / "run") as host:
        yield host


def carried_out(host: Hosted, effect: Effect, *keys: str) -> None:
    """Press the keys, and judge what reached the host and what is seen."""
    host.show(effect.view)
    before, after = "", ""

    async def step(pilot: Pilot[None]) -> None:
        nonlocal before, after
        await until(pilot, effect.view.clock)
        await pilot.press(*effect.first)
        before = await settled(pilot)
        await pilot.press(*keys, *effect.then)
        for _ in range(60):
            after = "" if pilot.app._exit else await settled(pilot)
            if effect.seen(before, after):
                return
            await pilot.pause(0.02)

    with RemoteSource(host.folder) as source:
        _, running = watched(source, step)
    assert effect.seen(before, after), f"before:\n{before}\nafter:\n{after}"
    assert [(event, text) for event, text, _ in host.received] == list(effect.received)
    assert {who for _, _, who in host.received} <= {person()}
    assert running is not effect.leaves


def test_the_table_here_names_every_command_and_every_key() -> None:
    assert list(EFFECTS) == list(BY_NAME)
    bindings = {binding.key for binding in WatchApp.BINDINGS if isinstance(binding, Binding)}
    assert bindings == set(BOUND)


@pytest.mark.parametrize("name", EFFECTS)
def test_each_command_has_its_effect_by_its_key(host: Hosted, name: str) -> None:
    carried_out(host, EFFECTS[name], BY_NAME[name].key)


@pytest.mark.parametrize("name", FROM_THE_LIST)
def test_each_command_has_its_effect_from_the_list(host: Hosted, name: str) -> None:
    words = max(re.split("[:;,()]", BY_NAME[name].words), key=len).strip()
    keys = ["space" if char == " " else char for char in words[:14]]
    carried_out(host, EFFECTS[name], "c", *keys, "enter")


@pytest.mark.parametrize("key", BOUND)
def test_each_bound_key_is_another_way_to_its_command(host: Hosted, key: str) -> None:
    carried_out(host, EFFECTS[BOUND[key]], key)


@pytest.mark.parametrize("key", ARROWS)
def test_each_arrow_looks_elsewhere(host: Hosted, key: str) -> None:
    carried_out(host, Effect(lambda before, after: after != before, first=CLOSE), key)


def test_an_equals_sign_will_do_for_the_plus_above_it(host: Hosted) -> None:
    carried_out(host, EFFECTS["closer"], "equals_sign")


def test_the_wheel_brings_the_floor_closer_and_takes_it_away_again(host: Hosted) -> None:
    def wheel(kind: type[MouseScrollUp | MouseScrollDown]) -> MouseScrollUp | MouseScrollDown:
        return kind(None, 20, 10, 0, 0, 0, False, False, False, 20, 10)

    seen: list[str] = []

    async def turn(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        for kind in (None, MouseScrollUp, MouseScrollUp, MouseScrollDown, MouseScrollDown):
            if kind is not None:
                pilot.app.screen._forward_event(wheel(kind))
            await pilot.pause(0.05)
            seen.append(await settled(pilot))

    step: Step = turn
    with RemoteSource(host.folder) as source:
        watched(source, step)
    whole, close, closest, wider, again = map(places, seen)
    assert whole > close > closest
    assert closest < wider < again
    assert seen[4] == seen[0]
    assert host.received == []
