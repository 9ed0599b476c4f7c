"""`trundle check` as a person and a script use it: findings with their names, estimates, the hour it begins, JSON."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

TRUNDLE = Path(sys.executable).parent / "trundle"
ROOT = Path(__file__).parents[2]


def check(*words: str | Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [TRUNDLE, "check", *words],
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
        env={**os.environ, "TERM": "dumb"},
        cwd=ROOT,
        stdin=subprocess.DEVNULL,
    )


@pytest.fixture
def round_of(tmp_path: Path) -> Path:
    """The evening round, beside its site and robot, to be changed."""
    for folder in ("sites", "robots"):
        (tmp_path / folder).symlink_to(ROOT / "missions" / folder)
    changed = tmp_path / "round.yaml"
    changed.write_text((ROOT / "missions" / "evening-round.yaml").read_text())
    return changed


def test_the_estimates_are_a_table_of_80_columns_with_what_they_take_for_granted() -> None:
    shown = check("evening-round")
    assert (shown.returncode, shown.stderr) == (0, "")
    assert max(map(len, shown.stdout.splitlines())) <= 80
    assert re.search(r"^the whole mission +6 min +7 min +\d+ min +\d+ m$", shown.stdout, re.MULTILINE)
    assert "Taken for granted:" in shown.stdout


def test_a_mission_begun_after_its_doors_are_shut_is_refused(round_of: Path) -> None:
    late = check(round_of, "--begins", "21:57")
    assert late.returncode == 2
    assert re.search(r"round\.yaml: error: The mission takes .* past its end-by time, 22:00\.", late.stderr)
    assert "[end-by-missed]" in late.stderr
    assert check(round_of, "--begins", "8 pm").returncode == 2


def test_findings_and_estimates_come_as_json(round_of: Path) -> None:
    round_of.write_text(round_of.read_text().replace("within: 6 min", "within: 20 s"))
    shown = check(round_of, "--json")
    assert shown.returncode == 2
    told = json.loads(shown.stdout)
    assert "within-too-short" in {finding["name"] for finding in told["findings"]}
    whole = told["estimates"]["seconds"]
    assert 0.0 < whole["least"] < whole["likely"] < whole["most"]
    assert told["estimates"]["steps"][0]["text"] == "go to ward west"


def test_a_note_is_silenced_in_the_file_by_its_name(round_of: Path) -> None:
    assert "[place-never-visited]" in check(round_of).stdout
    round_of.write_text(round_of.read_text() + "\nsilence: [place-never-visited]\n")
    quiet = check(round_of)
    assert "[place-never-visited]" not in quiet.stdout
    assert "1 silenced." in quiet.stdout


def test_a_routine_that_no_step_runs_is_a_warning_at_its_name(round_of: Path) -> None:
    round_of.write_text(round_of.read_text() + "\nroutines:\n  hand over:\n    steps:\n      - wait: 5 s\n")
    shown = check(round_of)
    assert shown.returncode == 0
    assert re.search(r'round\.yaml:\d+:3: warning: No step runs the routine "hand over"\.', shown.stderr)
