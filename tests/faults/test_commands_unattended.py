"""The commands by which an unattended run is looked after, each as a process of its own, and their exit codes."""

from __future__ import annotations

import contextlib
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

from runner.host.remote import UnreachableError, look
from runner.host.view import Health, View
from runner.journal.reader import open_record
from runner.journal.runs import find_run

TRUNDLE = Path(sys.executable).parent / "trundle"
MISSION = """mission: Long wait
site: {site}
robot: {robot}
start: charging bay
steps:
  - go: reception
  - wait: 3 h
  - go: charging bay
"""


def trundle(runs: Path, *words: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [str(TRUNDLE), *words],
        capture_output=True, text=True, timeout=120.0, check=False, env={**os.environ, "TRUNDLE_RUNS": str(runs)},
    )  # fmt: skip


def begin(runs: Path, *words: str) -> Path:
    """Start a run detached; its folder."""
    started = trundle(runs, "run", *words, "--detach")
    assert started.returncode == 0, started.stderr
    return find_run(runs)


def view_when(folder: Path, holds: Any, seconds: float = 30.0) -> View:
    """The first view of which `holds` is true."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        try:
            view = look(folder, 2.0).view
        except UnreachableError:
            view = None
        if view is not None and holds(view):
            return view
        time.sleep(0.05)
    raise AssertionError(f"this did not come about; last seen: {view}")


def process_of(folder: Path) -> int:
    """The process that owns a run, by the record that it has open."""
    for process in Path("/proc").glob("[0-9]*"):
        with contextlib.suppress(OSError):
            if any(os.readlink(file).startswith(f"{folder}/journal") for file in (process / "fd").iterdir()):
                return int(process.name)
    raise AssertionError("nobody owns the run")


def trouble_of(folder: Path, seconds: float) -> str:
    """What the record says of the first trouble; to ask the run itself would be to watch it."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        with open_record(folder) as record:
            for entry in record.entries(names=("trouble",)):
                return entry.body
        time.sleep(0.1)
    raise AssertionError("there was no trouble")


def mission_file(tmp_path: Path) -> Path:
    import missions

    there = Path(missions.__file__).parent
    path = tmp_path / "long-wait.yaml"
    path.write_text(MISSION.format(site=there / "sites/harbour-clinic.yaml", robot=there / "robots/small-cart.yaml"))
    return path


def test_a_killed_run_is_picked_up_verified_and_removed(tmp_path: Path) -> None:
    runs = tmp_path / "runs"
    folder = begin(runs, "evening-round", "--pace", "60")
    view_when(folder, lambda view: view.legs_arrived >= 1)
    refused = trundle(runs, "runs", "--remove", folder.name)
    assert refused.returncode != 0
    assert folder.is_dir()
    os.kill(process_of(folder), signal.SIGKILL)
    time.sleep(0.3)
    still = trundle(runs, "runs", "--remove", folder.name)
    assert still.returncode != 0, "it could still be picked up"
    assert trundle(runs, "verify", folder.name).returncode == 0, "what is there is sound"
    picked = trundle(runs, "pick-up", folder.name, "--plain")
    assert picked.returncode in (0, 4), picked.stdout
    verified = trundle(runs, "verify", folder.name)
    assert verified.returncode == 0, verified.stdout
    with open_record(folder) as record:
        assert [entry.name for entry in record.entries(names=("resumed",))] == ["resumed"]
    removed = trundle(runs, "runs", "--remove", folder.name)
    assert removed.returncode == 0, removed.stderr
    assert not folder.exists()


def test_what_is_not_there_is_told_in_words(tmp_path: Path) -> None:
    for words in (["verify", "nothing"], ["pick-up", "nothing"], ["runs", "--remove", "nothing"]):
        told = trundle(tmp_path, *words)
        assert told.returncode == 2, words
        assert "Traceback" not in told.stderr
    assert trundle(tmp_path, "pick-up", "--if-any").returncode == 0


def test_an_attended_run_is_held_when_its_last_watcher_is_gone(tmp_path: Path) -> None:
    runs = tmp_path / "runs"
    folder = begin(runs, "evening-round", "--pace", "1", "--attended", "3")
    watcher = subprocess.Popen(
        [str(TRUNDLE), "watch", folder.name, "--plain"],
        stdout=subprocess.DEVNULL, env={**os.environ, "TRUNDLE_RUNS": str(runs)},
    )  # fmt: skip
    try:
        time.sleep(5.0)
        view_when(folder, lambda view: view.health is not Health.HELD)
        watcher.kill()
        watcher.wait()
        assert "Nobody has watched" in trouble_of(folder, 15.0)
    finally:
        watcher.kill()
        watcher.wait()
        assert trundle(runs, "abort", folder.name).returncode == 0


def test_the_track_is_kept_for_no_longer_than_it_is_told(tmp_path: Path) -> None:
    runs = tmp_path / "runs"
    done = trundle(runs, "run", str(mission_file(tmp_path)), "--pace", "max", "--plain", "--track-hours", "1")
    assert done.returncode == 0, done.stdout
    with open_record(find_run(runs)) as record:
        stamps = [row.seen.stamp for row in record.track()]
        last = max(stamps)
    assert last > 3.0 * 3600.0
    assert last - 3600.0 - 1300.0 < min(stamps) < last - 3600.0, "an hour, and at most two snapshots more"
    assert trundle(runs, "verify").returncode == 0
