"""Every key and command: what reaches the host, and what is then on the screen.

The host's end is the board, gate and control server of a real run; the way there is its control socket.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from textual.pilot import Pilot

from runner.host.remote import RemoteSource, person
from runner.host.view import View
from runner.machine.table import Event
from runner.screen.commands import COMMANDS
from runner.screen.ink import DOTTED
from tests.screen.hosted import Hosted, hosted
from tests.screen.piloting import Step, pressing, until, watched
from tests.screen.scripted import ENDED, HELD, MOVING, NEEDS_YOU, TROUBLE


@pytest.fixture
def host(tmp_path: Path) -> Iterator[Hosted]:
    with hosted(tmp_path / "run") as host:
        yield host


def _at(
    host: Hosted, step: Step, view: View | None = None, read_only: bool = False, size: tuple[int, int] = (80, 24)
) -> tuple[str, bool]:
    """What is on a screen attached to the run after a step, and whether it is still there."""
    if view is not None:
        host.show(view)
    with RemoteSource(host.folder) as source:
        return watched(source, step, size, read_only=read_only)


@pytest.mark.parametrize(
    ("key", "view", "event", "then"),
    [
        ("h", MOVING, Event.HOLD, "H E L D"),
        ("r", HELD, Event.RELEASE, "M O V I N G"),
        ("r", TROUBLE, Event.RELEASE, "M O V I N G"),
    ],
)
def test_hold_and_release_take_one_key_and_are_seen_to_arrive(
    host: Hosted, key: str, view: View, event: Event, then: str
) -> None:
    text, running = _at(host, pressing(key, wanted=then, first=view.clock), view)
    assert host.received == [(event, "", person())]
    assert f"{event.value} by {person()}" in text
    assert running


def test_a_deed_says_first_that_it_was_sent_and_then_that_it_was_taken(host: Hosted) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        host.deaf.set()
        await pilot.press("h")
        await until(pilot, "hold: sent")
        await until(pilot, "no answer for 0:0")
        host.deaf.clear()
        await until(pilot, "hold: taken; the robot was told to halt")

    _at(host, step)
    assert [event for event, _, _ in host.received] == [Event.HOLD]


def test_skip_takes_one_key_and_what_had_no_effect_says_so(host: Hosted) -> None:
    text, _ = _at(host, pressing("s", wanted="skip: no effect now", first="M O V I N G"))
    assert [event for event, _, _ in host.received] == [Event.SKIP]
    assert "M O V I N G" in text


@pytest.mark.parametrize("keys", [("a", "y"), ("ctrl+c", "ctrl+c"), ("a", "ctrl+c"), ("ctrl+c", "y")])
def test_abort_takes_two_keys_halts_the_robot_and_the_screen_stays(host: Hosted, keys: tuple[str, str]) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        await pilot.press(*keys)
        await until(pilot, "abort: taken; the robot was told to halt")
        await until(pilot, "E N D E D   aborted")

    text, running = _at(host, step)
    assert [event for event, _, _ in host.received] == [Event.ABORT]
    assert host.robot.halts == 1
    assert running
    assert "trundle report evening-0312" in text


@pytest.mark.parametrize(("view", "before"), [(MOVING, ("question_mark",)), (NEEDS_YOU, ("enter",))])
def test_abort_is_two_keys_away_from_help_and_question_too(host: Hosted, view: View, before: tuple[str]) -> None:
    _at(host, pressing(*before, "a", "y", wanted="E N D E D", first=view.clock), view)
    assert host.robot.halts == 1


def test_a_robot_is_halted_by_abort_even_where_the_host_hangs(host: Hosted) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        host.deaf.set()
        await pilot.press("a", "y")
        await until(pilot, "abort: sent, no answer")

    _at(host, step)
    assert host.robot.halts == 1


@pytest.mark.parametrize("key", ["a", "ctrl+c"])
@pytest.mark.parametrize("back", ["escape", "n"])
def test_abort_asks_first_and_is_taken_back(host: Hosted, key: str, back: str) -> None:
    text, running = _at(host, pressing(key, first="M O V I N G"))
    assert "Abort the run? The robot halts." in text
    text, running = _at(host, pressing(key, "h", back, "y", wanted="h  hold", first="M O V I N G"))
    assert host.received == []
    assert host.robot.halts == 0
    assert running


def test_a_prompt_that_the_end_of_the_run_has_answered_is_taken_away(host: Hosted) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        await pilot.press("a")
        host.show(ENDED)
        await until(pilot, "E N D E D")

    text, _ = _at(host, step)
    assert "Abort" not in text


@pytest.mark.parametrize(("digit", "word"), [("1", "yes"), ("2", "no"), ("3", "come again")])
def test_a_question_is_answered_with_enter_and_a_digit(host: Hosted, digit: str, word: str) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "Enter  answer")
        await pilot.press("enter", digit)
        await until(pilot, f"answer {word}: taken")
        await until(pilot, f"answered by {person()}")

    text, _ = _at(host, step, NEEDS_YOU)
    assert "M O V I N G" in text
    assert host.received == [(Event.ANSWERED, word, person())]


def test_the_answers_are_shown_with_their_digits_and_others_do_nothing(host: Hosted) -> None:
    text, _ = _at(host, pressing("enter", "4", "0", "h", "x", first="Enter  answer"), NEEDS_YOU)
    assert " ".join(["1", "yes", "2", "no", "3", "come", "again"]) in " ".join(text.split())
    assert "Tray taken at laboratory?" in text
    text, _ = _at(host, pressing("enter", "escape", "1", first="Enter  answer"), NEEDS_YOU)
    assert "Enter  answer" in text
    assert host.received == []


def test_an_answer_is_never_given_to_another_question(host: Hosted) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "Enter  answer")
        await pilot.press("enter")
        host.show(replace(NEEDS_YOU, question="Open the door?", answers=("open", "leave shut")))
        await until(pilot, "the question is not open any more")
        await pilot.press("1")

    _at(host, step, NEEDS_YOU)
    assert host.received == []


def test_who_acted_is_seen_on_every_screen(host: Hosted) -> None:
    with RemoteSource(host.folder) as other:
        _at(host, pressing("h", wanted="H E L D", first="M O V I N G"))
        text, _ = watched(other, pressing(wanted="H E L D"))
    assert text.splitlines()[1].startswith(f" hold by {person()}")


def test_a_screen_that_only_looks_offers_and_does_nothing_that_acts(host: Hosted) -> None:
    keys = ("h", "s", "r", "a", "y", "enter", "1")
    text, running = _at(host, pressing(*keys, wanted="only for looking", first="M O V I N G"), read_only=True)
    assert running
    assert "only looking" in text
    assert "hold" not in text.splitlines()[-1]
    _, running = _at(host, pressing("ctrl+c", first="M O V I N G"), read_only=True)
    assert not running
    assert host.received == []
    assert host.robot.halts == 0


@pytest.mark.parametrize("key", ["q", "ctrl+q"])
@pytest.mark.parametrize("view", [MOVING, NEEDS_YOU, ENDED], ids=["moving", "needs you", "ended"])
def test_leaving_takes_one_key_and_leaves_the_run_alone(host: Hosted, key: str, view: View) -> None:
    _, running = _at(host, pressing(key, first=view.clock), view)
    assert not running
    assert host.received == []


def test_the_floor_is_seen_from_closer_moved_followed_and_whole_again(host: Hosted) -> None:
    whole, _ = _at(host, pressing(first="M O V I N G"))
    closer, _ = _at(host, pressing("plus", "plus", "plus", "plus", first="M O V I N G"))
    assert closer.count("◦") < whole.count("◦")
    assert "⢹" in closer or "⡏" in closer or "⠤" in closer
    moved, _ = _at(host, pressing("plus", "plus", "plus", "right", "up", first="M O V I N G"))
    assert moved != closer
    back, _ = _at(host, pressing("plus", "plus", "minus", "minus", first="M O V I N G"))
    again, _ = _at(host, pressing("f", "0", first="M O V I N G"))
    assert back == whole == again
    stays, _ = _at(host, pressing("left", wanted="the whole floor is in sight", first="M O V I N G"))
    assert "lift◦" in stays


def test_a_followed_robot_stays_in_sight(host: Hosted) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        await pilot.press("f", "plus")
        for number in (0, 40, 90, 120):
            assert MOVING.pose is not None
            pose = replace(MOVING.pose, x=5.0 + number * 0.25)
            view = replace(MOVING, pose=pose, route=(), clock=f"03:20:{number % 60:02}")
            host.show(view)
            await until(pilot, view.clock)
            await pilot.pause(0.3)
            floor = [line[:56] for line in (await _text(pilot)).splitlines()[3:18]]
            assert any(char in DOTTED.heading for line in floor for char in line)

    _at(host, step)


async def _text(pilot: Pilot[None]) -> str:
    from tests.screen.piloting import settled

    return await settled(pilot)


def test_help_names_every_key_and_every_mark_at_any_size(host: Hosted) -> None:
    text, _ = _at(host, pressing("question_mark", wanted="Esc  back", first="M O V I N G"), size=(100, 60))
    for command in COMMANDS:
        assert f" {command.cap} " in text
    assert "no emergency stop" in text
    small, _ = _at(host, pressing("question_mark", *["down"] * 60, first="MOVING"), size=(60, 20))
    assert "no emergency stop" in " ".join(small.split())
    back, _ = _at(host, pressing("question_mark", "escape", wanted="h  hold", first="M O V I N G"))
    assert "Evening specimen round" in back


def test_every_command_is_found_by_its_words_and_carried_out(host: Hosted) -> None:
    text, _ = _at(host, pressing("c", *"stands", wanted="hold: the robot stands", first="M O V I N G"))
    assert text.count("▶") == 1
    _at(host, pressing("c", *"stands", "enter", wanted="H E L D", first="M O V I N G"))
    assert [event for event, _, _ in host.received] == [Event.HOLD]
    nothing, _ = _at(host, pressing("c", *"xyz", wanted="none of that name"))
    assert "xyz_" in nothing
    fewer, _ = _at(host, pressing("c", *"xy", "backspace", "backspace", "down", "up", "escape", wanted="release"))
    assert "command:" not in fewer


def test_the_command_that_shows_the_record_can_be_copied(host: Hosted) -> None:
    text, _ = _at(host, pressing("k", wanted="copied: trundle report evening-0312", first="M O V I N G"))
    assert "copied" in text


def test_keys_in_the_footer_can_be_touched(host: Hosted) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        await pilot.click(offset=(3, 23))
        await until(pilot, "H E L D")
        await pilot.click(offset=(10, 10))
        await pilot.pause()

    text, _ = _at(host, step)
    assert [event for event, _, _ in host.received] == [Event.HOLD]
    assert "lift◦" not in text


def test_a_run_that_does_not_answer_is_shown_as_old_and_shown_anew_when_it_does(host: Hosted) -> None:
    async def step(pilot: Pilot[None]) -> None:
        await until(pilot, "M O V I N G")
        host.deaf.set()
        await until(pilot, "N O  N E W S   for 0:0")
        await until(pilot, f"since {MOVING.clock}")
        host.deaf.clear()
        await until(pilot, "M O V I N G")

    _at(host, step)
