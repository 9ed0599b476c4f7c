"""The Python interface: a mission run from code, its events as an iterator, and a person's acts from code."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pytest

import runner
from backends.contract import GoalReport, GoalStatus
from runner.engine.values import Answered, Ended, Go
from tests.builders import FAR, HOME, ROBOT, go, hall, mission, visit

MISSIONS = Path(__file__).parents[1] / "missions"


def test_a_mission_is_loaded_compiled_and_run_and_its_events_tell_of_it() -> None:
    loaded = runner.load(MISSIONS / "short-errand.yaml")
    machine = runner.compile(loaded)
    run = runner.run(machine, runner.simulator(loaded, seed=3))
    events = list(run)
    assert run.ending is runner.Ending.COMPLETED
    arrived = [event.what.place for event in events if isinstance(event.what, runner.LegEnded)]
    assert arrived == [event.what.place for event in events if isinstance(event.what, Go)]
    assert isinstance(events[-1].what, Ended)
    assert [event.stamp for event in events] == sorted(event.stamp for event in events)


def test_the_same_seed_gives_the_same_events() -> None:
    built = mission(visit([FAR, HOME]))
    machine = runner.compile(built)
    one, same = (list(runner.run(machine, runner.simulator(built, seed=5))) for _ in range(2))
    assert one == same


def test_a_question_is_answered_from_code() -> None:
    text = """
mission: ask
site: hall.yaml
robot: cart.yaml
start: home
steps:
  - ask: "Ready?"
    answers: [ready, later]
    up to: 5 min
    if silent: later
"""
    built = runner.read(text, hall(), ROBOT)
    run = runner.run(runner.compile(built), runner.simulator(built))
    answers = []
    for happened in run:
        if isinstance(happened.what, runner.Asked):
            run.answer("ready")
        if isinstance(happened.what, Answered):
            answers.append((happened.what.answer, happened.what.who))
    assert answers == [("ready", "program")]


def test_hold_release_skip_and_abort_work_from_code() -> None:
    built = mission(go(FAR), go(HOME))
    run = runner.run(runner.compile(built), runner.simulator(built))
    next(run)
    run.hold()
    run.release()
    run.skip()
    run.abort()
    assert [event.what.outcome.value for event in run if isinstance(event.what, runner.LegEnded)] == [
        "skipped",
        "aborted",
    ]
    assert run.ending is runner.Ending.ABORTED


def test_a_run_that_is_left_halts_the_robot() -> None:
    built = mission(go(FAR))
    robot = runner.simulator(built)
    run = runner.run(runner.compile(built), robot)
    while not isinstance(next(run).what, Go):
        pass
    robot.reports(5.0)
    run.close()
    said = [report for _ in range(40) for report in robot.reports(20.0)]
    assert GoalStatus.HALTED in [report.status for report in said if isinstance(report, GoalReport)]
    assert run.ending is None


def test_a_mistake_in_a_text_is_an_error_with_its_place() -> None:
    with pytest.raises(runner.LanguageError, match=r"<text>:1:1: error"):
        runner.read("mishion: x", hall(), ROBOT)


def test_importing_runner_loads_nothing_heavy() -> None:
    program = "import sys, runner; print(*sys.modules, sep='\\n')"
    loaded = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True).stdout.split()
    assert not {"numpy", "yaml", "msgspec", "zmq", "textual", "numba"} & set(loaded)


def test_the_example_in_the_readme_runs_as_it_is_written(capsys: pytest.CaptureFixture[str]) -> None:
    readme = (MISSIONS.parent / "README.md").read_text()
    example = re.search(r"```python\n(.*?)```", readme, re.DOTALL)
    assert example is not None
    exec(compile(example[1].replace('"missions/', f'"{MISSIONS}/'), "README.md", "exec"), {})  # noqa: S102
    assert capsys.readouterr().out.endswith("Ending.COMPLETED\n")
