"""Runs are named so that a person finds them, and found by what a person types."""

from __future__ import annotations

import os
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from runner.journal.errors import JournalError
from runner.journal.runs import find_run, list_runs, new_run, runs_folder
from runner.journal.writer import JournalWriter
from tests.journal.records import MACHINE, SOURCES, header

EVENING = datetime(2026, 12, 1, 18, 0, 7, tzinfo=UTC)


def recorded(runs: Path, mission: str, created: datetime) -> Path:
    """A run with a record in it, started at a time."""
    folder = new_run(runs, mission, created)
    values = header(folder.name)
    fields = {name: getattr(values, name) for name in values.__slots__}
    JournalWriter.create(folder, type(values)(**{**fields, "created": created}), SOURCES, MACHINE).close()
    return folder


def test_a_run_is_named_after_its_mission_and_the_time_of_its_start(tmp_path: Path) -> None:
    assert new_run(tmp_path, "Evening round", EVENING).name == "evening-round-20261201-180007"


@pytest.mark.parametrize(
    ("mission", "name"),
    [
        ("Überfahrt / Ärzte", "uberfahrt-arzte"),
        ("../../etc/passwd", "etc-passwd"),
        ("夜間", "run"),
        ("A mission with a very long name", "a-mission-with-a"),
        ("Donaudampfschifffahrtsgesellschaft", "donaudampfschifffahr"),
    ],
)
def test_any_mission_name_makes_a_folder_name_that_any_shell_takes(tmp_path: Path, mission: str, name: str) -> None:
    assert new_run(tmp_path, mission, EVENING).name == f"{name}-20261201-180007"


def test_runs_started_in_the_same_second_have_folders_of_their_own(tmp_path: Path) -> None:
    names = [new_run(tmp_path, "Evening round", EVENING).name for _ in range(3)]
    start = "evening-round-20261201-180007"
    assert names == [start, f"{start}-2", f"{start}-3"]


def test_the_folders_of_runs_are_for_their_owner_alone(tmp_path: Path) -> None:
    folder = new_run(tmp_path / "data" / "runs", "Evening round", EVENING)
    assert folder.stat().st_mode & 0o777 == 0o700
    assert folder.parent.stat().st_mode & 0o777 == 0o700


def test_runs_live_where_trundle_runs_says_or_in_the_data_folder() -> None:
    assert runs_folder({"TRUNDLE_RUNS": "/srv/nights", "XDG_DATA_HOME": "/data"}) == Path("/srv/nights")
    assert runs_folder({"XDG_DATA_HOME": "/data"}) == Path("/data/trundle/runs")
    assert runs_folder({"XDG_DATA_HOME": "not/absolute"}) == Path.home() / ".local/share/trundle/runs"
    assert runs_folder({}) == Path.home() / ".local/share/trundle/runs"


def test_runs_are_listed_newest_first_by_when_they_really_started(tmp_path: Path) -> None:
    summer = datetime(2026, 10, 25, 2, 50, tzinfo=UTC).astimezone(None)
    first = recorded(tmp_path, "Zebra", summer)
    second = recorded(tmp_path, "Ant", summer + timedelta(hours=1))
    third = recorded(tmp_path, "Ant", summer + timedelta(hours=1))
    (tmp_path / "not-a-run").mkdir()
    assert list_runs(tmp_path) == [third, second, first]


def test_an_unreadable_record_is_still_listed(tmp_path: Path) -> None:
    good = recorded(tmp_path, "Evening round", EVENING)
    bad = new_run(tmp_path, "Broken", EVENING)
    (bad / "journal.sqlite").write_bytes(b"not a database")
    os.utime(bad / "journal.sqlite", (0.0, 0.0))
    assert list_runs(tmp_path) == [good, bad]


def test_a_run_is_found_by_id_by_the_beginning_of_its_id_or_as_the_latest(tmp_path: Path) -> None:
    round_ = recorded(tmp_path, "Evening round", EVENING)
    again = recorded(tmp_path, "Evening round", EVENING)
    errand = recorded(tmp_path, "Short errand", EVENING - timedelta(days=1))
    assert find_run(tmp_path, round_.name) == round_
    assert find_run(tmp_path, "short") == errand
    assert find_run(tmp_path, "latest") == again
    assert find_run(tmp_path) == again


def test_a_run_is_found_by_its_path(tmp_path: Path) -> None:
    assert find_run(tmp_path, "./elsewhere/night") == Path("elsewhere/night")
    assert find_run(tmp_path, "journal.sqlite") == Path("journal.sqlite")


def refusal(runs: Path, text: str) -> str:
    with pytest.raises(JournalError) as caught:
        find_run(runs, text)
    return str(caught.value)


def test_a_beginning_that_fits_several_runs_names_them(tmp_path: Path) -> None:
    names = [recorded(tmp_path, mission, EVENING).name for mission in ("Evening round", "Evening errand")]
    message = refusal(tmp_path, "evening")
    assert message.startswith('2 runs begin with "evening". Write more of the name:')
    assert all(name in message for name in names)


def test_a_run_that_does_not_exist_is_answered_with_the_nearest(tmp_path: Path) -> None:
    name = recorded(tmp_path, "Evening round", EVENING).name
    message = refusal(tmp_path, "evenign-round-20261201")
    assert message.startswith('There is no run "evenign-round-20261201"')
    assert message.endswith(name)


def test_where_nothing_is_near_the_list_is_pointed_to(tmp_path: Path) -> None:
    recorded(tmp_path, "Evening round", EVENING)
    assert '"trundle runs" lists those there are.' in refusal(tmp_path, "qqqq")


def test_without_any_runs_that_is_said(tmp_path: Path) -> None:
    assert "There are no runs in" in refusal(tmp_path / "none", "latest")


def test_a_folder_for_runs_that_cannot_be_used_says_how_to_choose_another(tmp_path: Path) -> None:
    (tmp_path / "runs").write_text("a file")
    with pytest.raises(JournalError, match="Set TRUNDLE_RUNS to another"):
        new_run(tmp_path / "runs", "Evening round", EVENING)
