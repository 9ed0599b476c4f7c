"""What takes the place of floor and steps when it is asked for: the help, and the list of commands."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from runner.host.view import View
from runner.screen.commands import COMMANDS, Command, found
from runner.screen.ink import Glyphs, Ink, Row, cut, wrap

_CAP = 8

_ANSWERS = (
    "MOVING, WAITING: all is well. RECOVERING: it has trouble and helps itself.",
    "HELD: a person holds it. NEEDS YOU: it stands until somebody acts.",
    "NO NEWS: the run does not answer; what is shown is old. It may still drive.",
    "A message on the line above the feed says how far a deed has come: sent, then taken by the run.",
    "Abort is a request through software. It is no emergency stop.",
)


def _marks(glyphs: Glyphs) -> tuple[tuple[str, str], ...]:
    return (
        (glyphs.heading[0], "the robot and its heading; ? where the news are old"),
        (glyphs.route * 2, "the way it means to drive"),
        (glyphs.goal, "where the leg leads"),
        (glyphs.place, "a place"),
        (glyphs.sensed, "in its way, as it tells now"),
        (glyphs.before, "told of in the last two minutes, now gone or out of its reach"),
        (glyphs.stuck, "an incident began here, in this run"),
        (glyphs.trail, "where it drove, the last 100 m; a ring: where it may be"),
        (glyphs.door_across, "a door"),
        (glyphs.shut_across, "a door that is shut by its known hours; nobody has looked"),
    )


def help_rows(read_only: bool, run: str, width: int, glyphs: Glyphs) -> list[Row]:
    """The whole help; as many rows as it takes."""
    rows: list[Row] = [((f" {glyphs.say(f'Run {run}')}", Ink.STRONG),)]
    for command in COMMANDS:
        if not (command.acts and read_only):
            rows += _entry(command.cap, Ink.KEY, command.words, width, glyphs)
    rows.append(())
    for mark, words in _marks(glyphs):
        rows += _entry(mark, Ink.STRONG, words, width, glyphs)
    rows.append(())
    for text in _ANSWERS:
        rows += [((f" {line}", Ink.TEXT),) for line in wrap(text, width - 2, 4, glyphs.more)]
    return rows


def _entry(cap: str, ink: Ink, words: str, width: int, glyphs: Glyphs) -> list[Row]:
    lines = wrap(words, max(width - _CAP - 3, 1), 3, glyphs.more)
    first: Row = ((" ", Ink.TEXT), (f" {cap} ", ink), (" " * max(_CAP - len(cap) - 1, 1) + lines[0], Ink.TEXT))
    return [first, *(((" " * (_CAP + 2) + line, Ink.TEXT),) for line in lines[1:])]


@dataclass(frozen=True, slots=True)
class Choice:
    """A command being looked for: what was typed, and which of those found is chosen."""

    typed: str = ""
    at: int = 0

    def typing(self, char: str) -> Choice:
        """One more letter."""
        return Choice(self.typed + char)

    def less(self) -> Choice:
        """One letter less."""
        return Choice(self.typed[:-1])

    def moved(self, by: int, count: int) -> Choice:
        """Another of so many."""
        return replace(self, at=(self.at + by) % count if count else 0)


def chosen(choice: Choice, view: View | None, read_only: bool) -> Command | None:
    """The command that Enter would carry out."""
    commands = found(choice.typed, view, read_only)
    return commands[min(choice.at, len(commands) - 1)] if commands else None


def choice_rows(
    choice: Choice, view: View | None, read_only: bool, width: int, height: int, glyphs: Glyphs
) -> list[Row]:
    """What was typed, and the commands it finds, the chosen one marked and in sight."""
    commands = found(choice.typed, view, read_only)
    room = max(height - 1, 1)
    first = max(min(choice.at, len(commands) - 1) - room + 1, 0)
    rows = [
        _line(command, first + number == choice.at, width, glyphs)
        for number, command in enumerate(commands[first : first + room])
    ]
    typed: Row = ((" command: ", Ink.FAINT), (f"{glyphs.say(choice.typed)}_", Ink.STRONG))
    return [typed, *(rows or [((" none of that name", Ink.TEXT),)])]


def _line(command: Command, marked: bool, width: int, glyphs: Glyphs) -> Row:
    text = f"{glyphs.current if marked else ' '} {command.cap:<{_CAP}} {command.words}"
    return ((cut(text, width, glyphs.more), Ink.CURRENT if marked else Ink.TEXT),)


def scrolled(rows: Sequence[Row], at: int, height: int, glyphs: Glyphs) -> list[Row]:
    """A stretch of rows from that one on, saying how many are left below."""
    shown = list(rows[at : at + height])
    left = len(rows) - at - height
    if left > 0 and shown:
        shown[-1] = ((f" {glyphs.more} {left + 1} more below", Ink.FAINT),)
    return shown
