"""A run from begin to end on the simulated robot: deterministic at any pace, and safe when things fail."""

from __future__ import annotations

import resource
import subprocess
import sys
import threading
from collections.abc import Callable
from pathlib import Path

import pytest

from runner.host.board import Board
from runner.host.launch import LaunchError, Order, carry_out, make_backend, planned
from runner.host.view import Health
from runner.journal.reader import open_record
from runner.language.mission import Recovery, RecoveryKind, Step
from runner.machine.compiler import compile_mission
from runner.machine.table import Ending, Event
from runner.site.values import Carton, Conditions, Walkers
from tests.builders import FAR, HOME, SIDE, go, mission, rule, visit, wait

BUSY = Conditions(name="busy", walkers=(Walkers(2),))


def order(*steps: Step, seed: int = 1, pace: float | None = None, conditions: Conditions = BUSY) -> Order:
    written = mission(*steps)
    return Order(written, compile_mission(written), conditions, None, seed, pace)


def entries(folder: Path) -> list[tuple[object, ...]]:
    with open_record(folder) as record:
        return [(entry.seq, entry.stamp, entry.kind, entry.name, entry.body) for entry in record.entries()]


def run(given: Order, folder: Path, after_turn: Callable[[], None] = lambda: None) -> tuple[Ending, Board]:
    board = Board("nightwatch")
    return carry_out(given, folder, board, after_turn), board


ROUND = (visit([FAR, SIDE]), wait(3.0), go(HOME))


def test_a_round_is_driven_to_its_end_and_its_last_view_says_so(tmp_path: Path) -> None:
    ending, board = run(order(*ROUND), tmp_path)
    assert ending is Ending.COMPLETED
    view = board.view()
    assert view is not None
    assert (view.health, view.legs_arrived, view.legs_failed) == (Health.ENDED, 3, 0)
    assert [line.text for line in board.feed()][-1] == "mission ended: all steps done"


def test_the_same_seed_gives_the_same_entries_to_the_byte_and_another_seed_does_not(tmp_path: Path) -> None:
    for name, seed in (("one", 4), ("same", 4), ("other", 5)):
        run(order(*ROUND, seed=seed), tmp_path / name)
    assert entries(tmp_path / "one") == entries(tmp_path / "same")
    assert entries(tmp_path / "one") != entries(tmp_path / "other")


def test_the_pace_changes_nothing_in_the_record(tmp_path: Path) -> None:
    run(order(*ROUND), tmp_path / "max")
    run(order(*ROUND, pace=33.0), tmp_path / "paced")
    assert entries(tmp_path / "max") == entries(tmp_path / "paced")


def test_a_command_is_in_the_record_before_the_robot_can_answer_it(tmp_path: Path) -> None:
    run(order(go(FAR)), tmp_path)
    names = [name for _, _, _, name, _ in entries(tmp_path)]
    assert names.index("go") < names.index("goal news")


def test_an_abort_at_any_time_halts_and_ends_the_run(tmp_path: Path) -> None:
    board = Board("nightwatch")
    turns = 0

    def abort_later() -> None:
        nonlocal turns
        turns += 1
        if turns == 20:
            board.act(Event.ABORT)

    assert carry_out(order(*ROUND), tmp_path, board, abort_later) is Ending.ABORTED
    names = [name for _, _, _, name, _ in entries(tmp_path)]
    assert names[-5:] == ["operator acted", "halt", "halt", "leg ended", "ended"]


def test_a_hold_at_full_speed_slows_time_down_to_the_persons_own(tmp_path: Path) -> None:
    board = Board("nightwatch")
    board.act(Event.HOLD)
    release = threading.Timer(0.5, board.act, [Event.RELEASE])
    release.start()
    assert carry_out(order(go(FAR)), tmp_path, board, lambda: None) is Ending.COMPLETED
    with open_record(tmp_path) as record:
        stamps = {entry.name: entry.stamp for entry in record.entries(names=("operator acted", "operator"))}
    assert 0.3 < stamps["operator"] < 5.0


def test_a_carton_across_the_hall_is_an_incident_that_the_record_explains(tmp_path: Path) -> None:
    across = Carton(at=(6.0, 1.5), size=(0.4, 2.9), from_s=0.0, until_s=40.0)
    forget_far = rule(tries=5, recover=(Recovery(RecoveryKind.CLEAR, 8.0), Recovery(RecoveryKind.REST, 20.0)))
    given = order(go(FAR, forget_far), conditions=Conditions(cartons=(across,)))
    ending, board = run(given, tmp_path)
    assert ending is Ending.COMPLETED
    lines = [line.text for line in board.feed()]
    assert any(line.startswith("incident 1 at") for line in lines)
    assert any(line.startswith("incident 1 over, ended by clear 8 m") for line in lines)


def test_an_unknown_backend_is_refused_with_the_names_of_those_there_are() -> None:
    errand = planned(order(go(FAR)), "a-run")
    with pytest.raises(LaunchError, match=r'There is no backend "simm"\. Installed: .*sim'):
        make_backend("simm", errand.plan.setup, errand.machine)


FULL_DISK = """
import sys, tempfile
from pathlib import Path
from runner.host.launch import RunError
from tests.host.test_runs import limit_files, order, run, visit, FAR, HOME
from runner.language.mission import Repeat
from tests.builders import repeat
limit_files(400_000)
try:
    run(order(repeat(visit([FAR, HOME]), times=500)), Path(sys.argv[1]))
except RunError as error:
    print(error)
"""


def limit_files(size: int) -> None:
    """Let no file of this process grow beyond `size` bytes: a full disk, as far as a writer can tell."""
    import signal

    signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    resource.setrlimit(resource.RLIMIT_FSIZE, (size, size))


def test_when_the_record_cannot_be_written_the_run_ends_in_words_and_keeps_what_was_recorded(tmp_path: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-c", FULL_DISK, str(tmp_path)], capture_output=True, text=True, timeout=120, check=False
    )
    assert done.stdout.startswith("The record cannot be written: "), done.stderr
    kept = entries(tmp_path)
    assert len(kept) > 20
    assert [seq for seq, *_ in kept] == list(range(1, len(kept) + 1))
