"""Finding a file by what a person typed: a path that exists, or the name of an example that comes with Trundle.

The examples are the files of the installed package `missions`: `evening-round` is `missions/evening-round.yaml`,
and `quiet` among conditions is `missions/conditions/quiet.yaml`.
"""

from __future__ import annotations

import os
from pathlib import Path

from runner.language.diagnostics import WHOLE_FILE, Diagnostic, LanguageError, nearest, quoted
from runner.language.mission import Mark

MISSIONS, CONDITIONS = "", "conditions"
"""Folders of the package, and what is in them."""


def example_names(folder: str = MISSIONS) -> tuple[str, ...]:
    """Names of the example missions, or of the example `CONDITIONS`, sorted."""
    try:
        return tuple(sorted(path.stem for path in _folder(folder).iterdir() if path.suffix == ".yaml"))
    except (OSError, ModuleNotFoundError):
        return ()


def find_example(name: str, folder: str = MISSIONS) -> Path | None:
    """The file of an example, or None where there is none of that name."""
    return _folder(folder) / f"{name}.yaml" if name in example_names(folder) else None


def resolve_mission(argument: str) -> Path:
    """The mission file a person means: an existing path first, then an example; LanguageError with names otherwise."""
    return _resolve(argument, MISSIONS, "mission")


def resolve_conditions(argument: str) -> Path:
    """The conditions file a person means: an existing path first, then an example; LanguageError otherwise."""
    return _resolve(argument, CONDITIONS, "conditions")


def _resolve(argument: str, folder: str, kind: str) -> Path:
    if os.path.lexists(argument.replace("\0", "")) and "\0" not in argument:
        return Path(argument)
    example = find_example(argument, folder)
    if example is not None:
        return example
    if argument.endswith((".yaml", ".yml")) or os.sep in argument:
        sentence = f"There is no file {quoted(argument)}."
    else:
        sentence = f"There is no file and no example {kind} called {quoted(argument)}."
    help_text = nearest(Path(argument).stem, example_names(folder), f"example {kind}")
    raise LanguageError([Diagnostic(Mark(argument, WHOLE_FILE, 1), sentence, help_text)])


def _folder(folder: str) -> Path:
    """A folder of the installed examples, which are plain files in an editable install and in a wheel."""
    from importlib import resources

    return Path(str(resources.files("missions"))) / folder
