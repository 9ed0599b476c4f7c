"""`trundle run`: run a mission, on a screen or in plain lines, and say how it came out."""

from __future__ import annotations

import argparse
import signal
import sys
from typing import TYPE_CHECKING

from runner.cli.exits import Exit
from runner.cli.reading import check_all, read, show_findings, show_problems

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

    from runner.host.board import Board
    from runner.host.launch import Order
    from runner.journal.outcome import RunOutcome

SIGNALS = {signal.SIGINT: "Ctrl-C", signal.SIGTERM: "SIGTERM", signal.SIGHUP: "the lost terminal"}
"""Signals that abort a run in an orderly way, and who is named for them in the record."""


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "run",
        help="run a mission and watch it",
        description="Checks a mission and runs it on the simulated robot. In a terminal it shows a screen.",
    )
    parser.add_argument("mission", metavar="MISSION", help="a mission file, or the name of an example")
    parser.add_argument("--conditions", metavar="NAME", help="what the simulated world does: a file or an example")
    parser.add_argument("--seed", type=int, default=1, metavar="N", help="same seed, same run (default: 1)")
    parser.add_argument(
        "--pace",
        type=_pace,
        default=1.0,
        metavar="N",
        help="simulated seconds a second: 1, 10, ... or max (default: 1)",
    )
    parser.add_argument("--plain", action="store_true", help="plain lines instead of a screen")


def _pace(text: str) -> float | None:
    if text == "max":
        return None
    try:
        pace = float(text)
    except ValueError:
        pace = 0.0
    if not 0.01 <= pace <= 1000.0:
        raise argparse.ArgumentTypeError(f"'{text}' is not a pace: write a number from 0.01 to 1000, or max")
    return pace


def run(arguments: argparse.Namespace) -> int:
    order = _order(arguments)
    if order is None:
        return Exit.MISTAKE
    from runner.host.board import Board
    from runner.host.launch import LaunchError, RunError
    from runner.journal.errors import JournalError
    from runner.journal.header import person_and_host

    board = Board(person_and_host()[0])
    for number, who in SIGNALS.items():
        signal.signal(number, _aborting(board, who))
    try:
        folder = _new_folder(order)
        (_in_plain_lines if _plain(arguments) else _on_screen)(order, folder, board)
    except (LaunchError, JournalError) as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    except RunError as error:
        print(
            f"{error}\nThe robot was told to halt. The record up to then: trundle report {folder.name}", file=sys.stderr
        )
        return Exit.TROUBLE
    return _say_outcome(folder)


def _order(arguments: argparse.Namespace) -> Order | None:
    """Everything read and checked; None after what is wrong has been shown."""
    found = read(arguments.mission)
    if found is None:
        return None
    mission, machine = found
    findings = check_all(mission, machine)
    show_findings(findings, mission.sources)
    if any(finding.is_error for finding in findings):
        return None
    from runner.host.launch import Order
    from runner.language.diagnostics import LanguageError
    from runner.language.examples import resolve_conditions
    from runner.language.reader import load_conditions_with_source
    from runner.site.values import Conditions

    conditions, source = Conditions(), None
    if arguments.conditions is not None:
        try:
            conditions, source = load_conditions_with_source(resolve_conditions(arguments.conditions), mission.site)
        except LanguageError as error:
            show_problems(error)
            return None
    return Order(mission, machine, conditions, source, arguments.seed, arguments.pace)


def _new_folder(order: Order) -> Path:
    from datetime import datetime

    from runner.journal.runs import new_run, runs_folder

    return new_run(runs_folder(), order.mission.name, datetime.now())


def _plain(arguments: argparse.Namespace) -> bool:
    from runner.screen.terminal import suitable

    return arguments.plain or not (suitable(sys.stdout) and sys.stdin.isatty())


def _aborting(board: Board, who: str) -> Callable[..., None]:
    from runner.machine.table import Event

    return lambda *_: board.wish(Event.ABORT, who)


def _in_plain_lines(order: Order, folder: Path, board: Board) -> None:
    from runner.host.launch import carry_out
    from runner.screen.plain import PlainPrinter

    printer = PlainPrinter(sys.stdout)
    try:
        carry_out(order, folder, board, lambda: printer.show(board.feed(), board.view()))
    finally:
        printer.show(board.feed(), board.view())


def _on_screen(order: Order, folder: Path, board: Board) -> None:
    """The run in a thread of its own, the screen in this one; leaving the screen waits for the run to end."""
    from concurrent.futures import ThreadPoolExecutor

    from runner.host.launch import carry_out
    from runner.screen.showing import Showing
    from runner.screen.watch import watch

    mission = order.mission
    showing = Showing(
        mission=mission.name,
        run=folder.name,
        site=mission.site,
        robot=mission.robot,
        steps=order.machine.steps,
        report_hint=f"trundle report {folder.name}",
    )
    with ThreadPoolExecutor(max_workers=1, thread_name_prefix="host") as pool:
        running = pool.submit(carry_out, order, folder, board, lambda: None)
        try:
            watch(showing, board, running.done)
        finally:
            if not running.done():
                _aborting(board, "the screen that was left")()
        running.result()


def _say_outcome(folder: Path) -> int:
    from runner.journal.outcome import RunOutcome, outcome_of
    from runner.journal.reader import open_record

    with open_record(folder) as record:
        outcome = outcome_of(record)
    print(f"{outcome.value}\nThe record: trundle report {folder.name}")
    codes: dict[RunOutcome, Exit] = {
        RunOutcome.ALL_ARRIVED: Exit.OK,
        RunOutcome.SOME_MISSED: Exit.LEGS_MISSED,
        RunOutcome.ENDED_EARLY: Exit.ENDED_EARLY,
        RunOutcome.ABORTED: Exit.ABORTED,
    }
    return codes.get(outcome, Exit.TROUBLE)
