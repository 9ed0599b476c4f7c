"""`trundle new` writes files that really run; `trundle schema` prints what an editor can load."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path


def trundle(*arguments: str, runs: Path) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "TRUNDLE_RUNS": str(runs)}
    command = [sys.executable, "-c", "import sys; from runner.cli import main; sys.exit(main())", *arguments]
    return subprocess.run(command, capture_output=True, text=True, env=environment, timeout=300, check=False)


def test_what_is_written_passes_the_check_and_runs_to_its_end(tmp_path: Path) -> None:
    folder = tmp_path / "office"
    assert trundle("new", str(folder), runs=tmp_path / "runs").returncode == 0
    round_file = str(folder / "round.yaml")
    checked = trundle("check", round_file, runs=tmp_path / "runs")
    assert (checked.returncode, "error:" in checked.stderr, "warning:" in checked.stderr) == (0, False, False)
    done = trundle("run", round_file, "--pace", "max", "--plain", runs=tmp_path / "runs")
    assert done.returncode == 0, done.stdout + done.stderr
    assert "deliveries" in done.stdout


def test_nothing_is_overwritten(tmp_path: Path) -> None:
    (tmp_path / "robot.yaml").write_text("mine")
    refused = trundle("new", str(tmp_path), runs=tmp_path / "runs")
    assert refused.returncode == 2
    assert "robot.yaml is there already. Nothing was written" in refused.stderr
    assert (tmp_path / "robot.yaml").read_text() == "mine"
    assert not (tmp_path / "site.yaml").exists()


def test_a_folder_that_cannot_be_made_is_told_in_a_sentence(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    refused = trundle("new", str(tmp_path / "file" / "office"), runs=tmp_path / "runs")
    assert refused.returncode == 2
    assert "cannot be written" in refused.stderr
    assert "Traceback" not in refused.stderr


def test_the_schema_is_printed_as_json(tmp_path: Path) -> None:
    printed = trundle("schema", runs=tmp_path)
    assert json.loads(printed.stdout)["title"] == "Trundle mission"
