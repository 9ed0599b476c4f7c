"""A person names a file or an example, and gets it, or the nearest name."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from runner.language.diagnostics import LanguageError
from runner.language.examples import (
    CONDITIONS,
    example_names,
    find_example,
    resolve_conditions,
    resolve_mission,
)
from runner.language.reader import load_conditions, load_mission


def test_every_example_mission_is_read() -> None:
    assert "evening-round" in example_names()
    for name in example_names():
        path = find_example(name)
        assert path is not None
        assert load_mission(path).steps


def test_examples_of_conditions_are_found_by_name() -> None:
    assert "quiet" in example_names(CONDITIONS)
    mission = load_mission(resolve_mission("evening-round"))
    assert load_conditions(resolve_conditions("quiet"), mission.site).name


def test_a_path_that_exists_goes_before_an_example(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "evening-round").write_text("mission: Mine\n")
    monkeypatch.chdir(tmp_path)
    assert resolve_mission("evening-round") == Path("evening-round")


def test_a_name_of_nothing_is_answered_with_the_nearest_example() -> None:
    with pytest.raises(LanguageError) as caught:
        resolve_mission("evening-rond")
    assert 'no example mission called "evening-rond"' in str(caught.value)
    assert 'The nearest example mission is "evening-round".' in str(caught.value)


@pytest.mark.parametrize("argument", ["", "\0", "missions/nothing.yaml", "../x", "caf\u00e9", "x" * 10_000])
def test_no_argument_breaks_the_search(argument: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    with pytest.raises(LanguageError) as caught:
        resolve_mission(argument)
    assert str(caught.value).isascii()


def test_the_room_is_imported_without_yaml_and_numpy() -> None:
    code = "import sys, runner.language.reader, runner.language.examples; print(*{'yaml', 'numpy'} & set(sys.modules))"
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert shown.stdout.strip() == ""
