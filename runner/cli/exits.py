"""The exit codes of every command. They are listed in README.md, and a test compares the two."""

from __future__ import annotations

from enum import IntEnum


class Exit(IntEnum):
    """What the shell is told."""

    OK = 0
    FAULT = 1
    MISTAKE = 2
    LEGS_MISSED = 3
    ENDED_EARLY = 4
    ABORTED = 5
    TROUBLE = 6


MEANINGS: dict[Exit, str] = {
    Exit.OK: "all is well; after `run`: the mission was completed and every leg arrived",
    Exit.FAULT: "a fault of Trundle's own",
    Exit.MISTAKE: "a mistake in the command or in a file; nothing was driven",
    Exit.LEGS_MISSED: "the mission was completed, but not every leg arrived",
    Exit.ENDED_EARLY: "the mission ended early: a leg failed with nothing else to do, or the end-by time came",
    Exit.ABORTED: "a person aborted the mission",
    Exit.TROUBLE: "the robot or the record failed during the run; the robot was told to halt",
}
