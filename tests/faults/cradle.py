"""Starts hosts quickly, to be killed: everything is imported once, and each host is a fork of that.

`python -m tests.faults.cradle` reads lines "begin FOLDER" and "pick-up FOLDER", starts a process that owns the run, and
says its id. "wait ID" says its exit status once it is over. The mission is `round_of`.
"""

from __future__ import annotations

import importlib.metadata
import os
import signal
import sys
from pathlib import Path

from runner.host.board import Board
from runner.host.launch import Order, begin, left, pick_up, planned
from runner.host.plan import Care
from runner.host.process import owning, stop_on_request
from runner.language.mission import Otherwise, Step
from runner.machine.compiler import compile_mission
from runner.site.values import Conditions
from tests.builders import FAR, HOME, SIDE, go, mission, repeat, rule, visit, wait
from tests.faults import robot_backend


def round_of(laps: int) -> tuple[Step, ...]:
    """A busy round: legs, waits, a loop; whatever fails is skipped."""
    under = rule(tries=4)
    return (
        repeat(
            visit([FAR, SIDE], under, otherwise=Otherwise.SKIP),
            wait(1.0),
            go(HOME, under, within=200.0, otherwise=Otherwise.SKIP),
            wait(0.3),
            times=laps,
        ),
    )


def order_of(laps: int) -> Order:
    written = mission(*round_of(laps))
    care = Care(patience=None)
    return Order(written, compile_mission(written), Conditions(), None, 1, None, backend="faults robot", care=care)


class _EntryPoint:
    """Stands in for the entry point that the robot's own distribution would have."""

    name = "faults robot"

    def load(self) -> object:
        return robot_backend.create


def install_robot() -> None:
    """Let the robot of these tests be found as an installed one would be."""
    from runner.host import launch

    found = importlib.metadata.entry_points

    def entry_points(**wanted: str) -> object:
        return (_EntryPoint(),) if wanted.get("name") == _EntryPoint.name else found(**wanted)

    launch.entry_points = entry_points  # type: ignore[assignment]


def own(command: str, folder: Path, laps: int) -> int:
    stop_on_request()
    board = Board("nobody")
    if command == "begin":
        return owning(lambda: begin(planned(order_of(laps), folder.name), folder, board, lambda: None))
    return owning(lambda: pick_up(left(folder), folder, board, lambda: None))


def main() -> None:
    install_robot()
    laps = int(sys.argv[1])
    print("ready", flush=True)
    for line in sys.stdin:
        command, _, argument = line.strip().partition(" ")
        if command == "wait":
            _, status = os.waitpid(int(argument), 0)
            print(os.waitstatus_to_exitcode(status), flush=True)
            continue
        child = os.fork()
        if child == 0:
            signal.signal(signal.SIGINT, signal.SIG_IGN)
            os._exit(own(command, Path(argument), laps))
        print(child, flush=True)


if __name__ == "__main__":
    main()
