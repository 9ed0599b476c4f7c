"""Trundle: scripted rounds for one indoor mobile robot.

`import runner` gives the Python interface, which is written in `runner.api` and loaded at first use.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from runner.api import (
        Asked,
        Ending,
        Happened,
        LanguageError,
        LaunchError,
        LegEnded,
        Machine,
        Mission,
        Running,
        compile,  # noqa: A004 - the word for it
        load,
        read,
        run,
        simulator,
    )

__all__ = [
    "Asked", "Ending", "Happened", "LanguageError", "LaunchError", "LegEnded", "Machine", "Mission", "Running",
    "compile", "load", "read", "run", "simulator",
]  # fmt: skip


def __getattr__(name: str) -> Any:
    if name in __all__:
        from runner import api

        return getattr(api, name)
    raise AttributeError(f"module 'runner' has no attribute '{name}'")
