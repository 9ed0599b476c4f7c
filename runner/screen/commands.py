"""Everything a person can do at the screen, as one table: footer, help and the list of commands are made of it."""

from __future__ import annotations

from dataclasses import dataclass

from runner.host.view import Health, View


@dataclass(frozen=True, slots=True)
class Command:
    """`key` is the key's name as Textual has it, `cap` as it is shown, `label` the word in the footer (empty: not
    there). What `acts` reaches the run; a screen that may only look does not have it."""

    name: str
    key: str
    cap: str
    label: str
    words: str
    acts: bool = False
    spare: bool = False
    """Left out of the footer where there is no room for all."""


COMMANDS = (
    Command("answer", "enter", "Enter", "answer", "answer the question that is open", True),
    Command("hold", "h", "h", "hold", "hold: the robot stands until it is released", True),
    Command("release", "r", "r", "release", "release: go on where it was held", True),
    Command("skip", "s", "s", "skip", "skip: give up this leg, go on with the next step", True),
    Command("abort", "a", "a", "abort", "abort: the robot halts, the mission ends; then y", True),
    Command("closer", "plus", "+", "closer", "see the floor from closer", spare=True),
    Command("wider", "minus", "-", "", "see more of the floor"),
    Command("whole", "0", "0", "", "see the whole floor"),
    Command("follow", "f", "f", "", "go along with the robot, from close by"),
    Command("up", "up", "arrows", "", "look elsewhere on the floor"),
    Command("mouse", "m", "m", "", "mouse on or off (off leaves selecting text to the terminal)"),
    Command("copy", "k", "k", "", "copy the command that shows the record"),
    Command("commands", "c", "c", "", "list all commands; type to find one"),
    Command("help", "question_mark", "?", "help", "what the keys and marks mean"),
    Command("suspend", "ctrl+z", "Ctrl-Z", "", "back to the shell for a while; fg returns"),
    Command("leave", "q", "q", "leave", "leave; the run goes on by itself"),
)
BY_NAME = {command.name: command for command in COMMANDS}
BY_KEY = {command.key: command.name for command in COMMANDS} | {"equals_sign": "closer"}
"""The key with the plus on it will do without shift."""


def means_something(command: Command, view: View | None, read_only: bool) -> bool:
    """Whether a command has a use now."""
    if command.acts and (read_only or view is None or view.outcome is not None):
        return False
    stands = view is not None and (
        view.health is Health.HELD or (view.health is Health.NEEDS_YOU and view.question is None)
    )
    match command.name:
        case "answer":
            return view is not None and bool(view.answers)
        case "hold":
            return not stands
        case "release":
            return stands
        case _:
            return True


def found(query: str, view: View | None, read_only: bool) -> list[Command]:
    """The commands in whose words every word of the query is."""
    wanted = query.lower().split()
    return [
        command
        for command in COMMANDS
        if command.name != "commands"
        and means_something(command, view, read_only)
        and all(word in f"{command.name} {command.words}".lower() for word in wanted)
    ]
