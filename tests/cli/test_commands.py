"""The installed command, as a person or a script uses it: outputs, errors, exit codes."""

from __future__ import annotations

import os
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from runner.cli.exits import MEANINGS
from runner.journal.reader import open_record
from runner.journal.runs import find_run

TRUNDLE = Path(sys.executable).parent / "trundle"
ROOT = Path(__file__).parents[2]


@pytest.fixture
def home(tmp_path: Path) -> dict[str, str]:
    """An environment whose runs go to a folder of the test's own."""
    return {**os.environ, "TRUNDLE_RUNS": str(tmp_path / "runs"), "TERM": "dumb"}


def trundle(*words: str, env: dict[str, str]) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [TRUNDLE, *words],
        capture_output=True,
        text=True,
        timeout=180,
        check=False,
        env=env,
        cwd=ROOT,
        stdin=subprocess.DEVNULL,
    )


def test_help_lists_the_commands_and_the_exit_codes(home: dict[str, str]) -> None:
    shown = trundle("--help", env=home)
    assert shown.returncode == 0
    for word in ("check", "machine", "run", "runs", "report"):
        assert re.search(rf"^    {word} ", shown.stdout, re.MULTILINE)
    for code, meaning in MEANINGS.items():
        assert f"  {code.value}  {meaning}" in shown.stdout


def test_the_readme_lists_the_same_exit_codes() -> None:
    readme = (ROOT / "README.md").read_text()
    listed = dict(re.findall(r"^\| (\d) \| (.+) \|$", readme, re.MULTILINE))
    assert listed == {str(code.value): meaning for code, meaning in MEANINGS.items()}


def test_nothing_heavy_is_loaded_for_help() -> None:
    program = (
        "import sys, runner.cli as c\ntry: c.main(['--help'])\nexcept SystemExit: pass\nprint(*sys.modules, sep='\\n')"
    )
    loaded = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True).stdout.split()
    assert not {"numpy", "scipy", "numba", "textual", "yaml", "sqlite3", "msgspec", "asyncio"} & set(loaded)


def test_check_needs_no_compiler() -> None:
    program = "import sys, runner.cli as c\nc.main(['check', 'evening-round'])\nprint(*sys.modules, sep='\\n')"
    loaded = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True).stdout.split()
    assert "scipy.ndimage" in loaded
    assert not {"numba", "textual", "backends.sim.simulator"} & set(loaded)


def test_check_passes_every_example(home: dict[str, str]) -> None:
    for mission in sorted((ROOT / "missions").glob("*.yaml")):
        checked = trundle("check", str(mission), env=home)
        assert (checked.returncode, checked.stderr) == (0, "")
        assert "No fault found." in checked.stdout


def test_a_mistake_in_a_file_is_shown_with_its_place_and_nothing_is_driven(
    home: dict[str, str], tmp_path: Path
) -> None:
    text = (ROOT / "missions" / "evening-round.yaml").read_text()
    for folder in ("sites", "robots"):
        (tmp_path / folder).symlink_to(ROOT / "missions" / folder)
    broken = tmp_path / "broken.yaml"
    broken.write_text(text.replace("go: imaging", "go: imagining"))
    for command in (("check",), ("run", "--plain", "--pace", "max"), ("machine",)):
        done = trundle(*command, str(broken), env=home)
        assert done.returncode == 2
        assert re.search(r'broken\.yaml:\d+:\d+: error: .*"imagining"', done.stderr)
        assert 'The nearest place is "imaging".' in done.stderr
        assert "Traceback" not in done.stderr
    assert not (tmp_path / "runs").exists()


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (("run", "evening-rond"), "evening-round"),
        (("run", "evening-round", "--conditions", "bussy"), "busy"),
        (("run", "evening-round", "--pace", "fast"), "write a number from 0.01 to 1000, or max"),
        (("report", "no-such-run"), 'There is no run "no-such-run"'),
        (("machine", "no/such/file.yaml"), "There is no file"),
        (("drive",), "invalid choice"),
    ],
)
def test_a_mistake_in_a_command_is_told_in_words(words: tuple[str, ...], sentence: str, home: dict[str, str]) -> None:
    done = trundle(*words, env=home)
    assert done.returncode == 2
    assert sentence in done.stderr
    assert "Traceback" not in done.stderr


def test_a_machine_is_compared_with_that_of_a_run(home: dict[str, str]) -> None:
    assert trundle("run", "short-errand", "--pace", "max", "--plain", env=home).returncode == 0
    same = trundle("machine", "short-errand", "--compare", "latest", env=home)
    assert (same.returncode, same.stdout) == (0, "The run's machine is the same.\n")
    other = trundle("machine", "evening-round", "--compare", "latest", env=home)
    assert other.returncode == 0
    assert "+machine: Evening specimen round" in other.stdout


@pytest.mark.parametrize("form", ["table", "dot", "mermaid", "json"])
def test_the_machine_is_printed_in_each_form(form: str, home: dict[str, str]) -> None:
    shown = trundle("machine", "short-errand", "--as", form, env=home)
    assert shown.returncode == 0
    assert {"table": "machine: ", "dot": "digraph ", "mermaid": "stateDiagram-v2", "json": '{"name":'}[
        form
    ] in shown.stdout


def test_a_blocked_corridor_is_got_through_and_the_report_says_how(home: dict[str, str]) -> None:
    words = ("--conditions", "missions/conditions/blocked-corridor.yaml", "--pace", "max", "--plain", "--seed", "3")
    done = trundle("run", "missions/evening-round.yaml", *words, env=home)
    assert done.returncode == 0, done.stdout + done.stderr
    assert re.search(r"recovery \d+, try \d+: clear", done.stdout)
    assert re.search(r"recovery \d+, try \d+: replan", done.stdout)
    report = trundle("report", env=home).stdout
    assert re.search(r"^Incident 1: \d\d:\d\d:\d\d, ", report, re.MULTILINE)
    assert re.search(r"^  Where +.* at x [\d.]+ m, y [\d.]+ m$", report, re.MULTILINE)
    assert re.search(r"^  Ended +by (clear|replan|ease back|rest|a new try)", report, re.MULTILINE)


def test_a_door_shut_for_good_fails_the_leg_after_its_tries_and_takes_otherwise(home: dict[str, str]) -> None:
    words = ("--conditions", "door-shut-for-good", "--pace", "max", "--plain", "--seed", "3")
    done = trundle("run", "evening-round", *words, env=home)
    assert done.returncode == 3, done.stdout + done.stderr
    failed = re.search(r"leg to (.+) failed: all (\d) tries failed", done.stdout)
    assert failed is not None
    assert len(re.findall(r"try \d failed; next try", done.stdout)) == int(failed[2]) - 1
    assert re.search(rf"{failed[1]} +failed", trundle("report", env=home).stdout)


def test_runs_are_listed_and_the_report_comes_as_json_too(home: dict[str, str]) -> None:
    import json

    assert trundle("run", "short-errand", "--pace", "max", "--plain", env=home).returncode == 0
    assert re.search(
        r"^short-errand-\S+ +Short errand +completed +4/4$", trundle("runs", env=home).stdout, re.MULTILINE
    )
    assert len(json.loads(trundle("runs", "--json", env=home).stdout)) == 1
    assert json.loads(trundle("report", "--json", env=home).stdout)["legs"]


@pytest.mark.parametrize(("number", "who"), [(signal.SIGINT, "Ctrl-C"), (signal.SIGTERM, "SIGTERM")])
def test_a_signal_aborts_in_an_orderly_way(
    number: signal.Signals, who: str, home: dict[str, str], tmp_path: Path
) -> None:
    running = subprocess.Popen(
        [TRUNDLE, "run", "evening-round", "--plain", "--pace", "10"],
        stdout=subprocess.PIPE,
        text=True,
        env=home,
        cwd=ROOT,
    )
    assert running.stdout is not None
    for line in running.stdout:
        if "step:" in line:
            break
    time.sleep(0.5)
    running.send_signal(number)
    rest = running.stdout.read()
    assert running.wait(timeout=30) == 5
    assert f"aborted by {who}" in rest
    with open_record(find_run(tmp_path / "runs")) as record:
        names = [entry.name for entry in record.entries()]
    assert names[-1] == "ended"
    assert "halt" in names


def test_output_into_a_closed_pipe_ends_quietly(home: dict[str, str]) -> None:
    words = f"'{TRUNDLE}' machine evening-round | head -1"
    shown = subprocess.run(["sh", "-c", words], capture_output=True, text=True, env=home, cwd=ROOT, check=False)
    assert (shown.stdout.startswith("machine: "), shown.stderr) == (True, "")
