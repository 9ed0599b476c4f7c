"""Example missions over the link to a robot in a process of its own: through cuts, and restarts of both sides."""

from __future__ import annotations

import contextlib
import json
import os
import re
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from random import Random

import pytest

from runner.cli.exits import Exit
from runner.engine.values import Ended, Go, GoalNews, Halt
from runner.journal.errors import JournalError
from runner.journal.outcome import RunOutcome, outcome_of
from runner.journal.reader import open_record
from runner.journal.replay import verify
from runner.journal.schema import FILE_NAME
from tests.faults.line_proxy import Proxy, free_port

TRUNDLE = [sys.executable, "-c", "from runner.cli import main; raise SystemExit(main())"]


def environment(runs: Path) -> dict[str, str]:
    return {**os.environ, "TRUNDLE_RUNS": str(runs)}


@contextmanager
def robot(mission: str, port: int, pace: float, keep: Path) -> Iterator[subprocess.Popen[str]]:
    """The mission's robot, simulated and ready, in a process of its own."""
    command = [*TRUNDLE, "link", "serve", mission, "--at", f"tcp://127.0.0.1:{port}", "--pace", f"{pace:g}"]
    process = subprocess.Popen([*command, "--keep", str(keep)], stdout=subprocess.PIPE, text=True)
    try:
        assert process.stdout is not None
        assert "is at tcp://" in process.stdout.readline()
        yield process
    finally:
        process.kill()
        process.wait()


def run(mission: str, runs: Path, *options: str) -> subprocess.Popen[str]:
    command = [*TRUNDLE, "run", mission, "--plain", *options]
    return subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True, env=environment(runs))


def finished(process: subprocess.Popen[str], seconds: float) -> tuple[int, list[str]]:
    """The exit code and what became of each leg, by place, in order."""
    output, _ = process.communicate(timeout=seconds)
    return process.returncode, re.findall(r"(arrived at [\w ]+|leg to [\w ]+ \w+):", output)


def account(folder: Path) -> tuple[list[int], list[int]]:
    """Ids of the goals that were sent, and of those that ended, as the record has them."""
    with open_record(folder) as record:
        values = [entry.value for entry in record.entries()]
    sent = [value.goal_id for value in values if isinstance(value, Go)]
    ended = [value.goal_id for value in values if isinstance(value, GoalNews) and value.event is not None]
    return sent, ended


def run_folder(runs: Path) -> Path:
    """The one run in there, once it is there."""
    end = time.monotonic() + 120.0
    while time.monotonic() < end:
        if found := list(runs.glob(f"*/{FILE_NAME}")):
            return found[0].parent
        time.sleep(0.05)
    raise AssertionError("no run began")


def test_a_mission_comes_out_over_the_link_as_it_does_directly_through_cuts(tmp_path: Path) -> None:
    pace = 10.0
    direct = finished(run("short-errand", tmp_path / "direct", "--pace", "max"), 120.0)
    port = free_port()
    with robot("short-errand", port, pace, tmp_path / "keep"):
        proxy = Proxy(port)
        process = run("short-errand", tmp_path / "runs", "--robot", f"tcp://127.0.0.1:{proxy.port}")
        for number in range(6):
            time.sleep(1.2)
            proxy.cut(5.0 / pace, breaks=number % 2 == 0)
        linked = finished(process, 120.0)
        proxy.close()
    assert linked == direct
    assert_each_goal_once(run_folder(tmp_path / "runs"))


def test_an_abort_while_the_line_is_cut_ends_the_run_and_the_robot_stands(tmp_path: Path) -> None:
    """It stops itself by silence, and the halt reaches it once the line is there again."""
    port = free_port()
    with robot("short-errand", port, 1.0, tmp_path / "keep"):
        proxy = Proxy(port)
        process = run("short-errand", tmp_path / "runs", "--robot", f"tcp://127.0.0.1:{proxy.port}")
        folder = run_folder(tmp_path / "runs")
        wait_for_a_goal(folder)
        proxy.cut(4.0, breaks=False)
        process.send_signal(signal.SIGTERM)
        code, _ = finished(process, 30.0)
        proxy.close()
        time.sleep(3.0)  # the silence that is agreed, and braking
        before = standing_at(tmp_path / "keep")
        time.sleep(1.0)
        after = standing_at(tmp_path / "keep")
    assert code == Exit.ABORTED
    assert before == pytest.approx(after, abs=0.03), "it stands, but for what it believes"
    with open_record(folder) as record:
        assert outcome_of(record) is RunOutcome.ABORTED
        assert any(isinstance(entry.value, Halt) for entry in record.entries())
        assert verify(record).parting is None


def wait_for_a_goal(folder: Path, seconds: float = 60.0) -> None:
    """Until the robot was sent somewhere and has set off."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        with contextlib.suppress(JournalError), open_record(folder) as record:  # it may only just be begun
            if any(isinstance(entry.value, GoalNews) for entry in record.entries()):
                time.sleep(2.0)
                return
        time.sleep(0.1)
    raise AssertionError("the robot was sent nowhere")


def standing_at(keep: Path) -> list[float]:
    """Where a robot stands, by its own note of a moment ago."""
    pose: list[float] = json.loads(keep.read_text())["pose"]
    return pose


@pytest.mark.soak
@pytest.mark.parametrize("mission", ["short-errand", "evening-round"])
def test_a_mission_survives_ten_cuts_of_five_seconds_and_a_restart_of_each_side(mission: str, tmp_path: Path) -> None:
    direct = finished(run(mission, tmp_path / "direct", "--pace", "max"), 300.0)
    linked, folder = through_cuts_and_restarts(mission, tmp_path, 1.0, ((6.0, 9.0), (6.0, 9.0)), 6.0)
    assert linked == direct
    assert_each_goal_once(folder)


@pytest.mark.soak
def test_a_whole_night_over_the_link_ends_as_it_does_directly(tmp_path: Path) -> None:
    """Seven times as fast as a clock, ten cuts of five seconds of the robot's time, and a restart of each side.

    No faster: the robot must start again before its time says that it was silent for half a minute.
    """
    mission = "overnight-endurance"
    direct = finished(run(mission, tmp_path / "direct", "--pace", "max"), 600.0)
    linked, folder = through_cuts_and_restarts(mission, tmp_path, 7.0, ((6.0, 20.0), (6.0, 600.0)), 30.0)
    assert linked[0] == direct[0]
    assert_each_goal_once(folder)
    assert last_words(folder) == last_words(run_folder(tmp_path / "direct"))


def through_cuts_and_restarts(
    mission: str, place: Path, pace: float, pauses: tuple[tuple[float, float], tuple[float, float]], alone: float
) -> tuple[tuple[int, list[str]], Path]:
    """The mission over the link: five cuts, the host killed and picked up, the robot killed and started again, five
    cuts. A cut takes five seconds of the robot's time; `pauses` are least and most wall seconds between two of them,
    before and after the restarts, and `alone` those between the two restarts.

    What `finished` says of it, and the folder of its run.
    """
    chance = Random(mission)  # noqa: S311  a test's chance, not a secret
    port, runs, keep = free_port(), place / "runs", place / "keep"
    proxy = Proxy(port)

    def cut_now_and_then(least: float, most: float) -> None:
        for number in range(5):
            time.sleep(chance.uniform(least, most))
            proxy.cut(5.0 / pace, breaks=number % 2 == 0)

    with robot(mission, port, pace, keep) as first:
        process = run(mission, runs, "--robot", f"tcp://127.0.0.1:{proxy.port}")
        folder = run_folder(runs)
        cut_now_and_then(*pauses[0])
        time.sleep(8.0)
        process.send_signal(signal.SIGKILL)
        legs = finished(process, 60.0)[1]
        time.sleep(1.0)
        again = subprocess.Popen(
            [*TRUNDLE, "pick-up", str(folder), "--plain"], stdout=subprocess.PIPE, text=True, env=environment(runs)
        )
        time.sleep(alone)
        first.kill()
    with robot(mission, port, pace, keep):
        cut_now_and_then(*pauses[1])
        code, later = finished(again, 7200.0)
    proxy.close()
    print(f"{mission}: exit {code}, {len(account(folder)[0])} goals, {len(legs) + len(later)} legs told of")
    return (code, [*legs, *later]), folder


def assert_each_goal_once(folder: Path) -> None:
    """None was sent twice, and none was lost."""
    sent, ended = account(folder)
    assert sent == ended
    assert len(set(sent)) == len(sent)


def last_words(folder: Path) -> list[Ended]:
    """How the mission ended, as the record has it."""
    with open_record(folder) as record:
        return [entry.value for entry in record.entries() if isinstance(entry.value, Ended)]
