"""`trundle run`: run a mission, on a screen or in plain lines, and say how it came out."""

from __future__ import annotations

import argparse
import sys
from dataclasses import replace
from typing import TYPE_CHECKING

from runner.cli.care import add_care_options, care_of
from runner.cli.exits import Exit
from runner.cli.link import add_robot_options, area_is_clear, line_of
from runner.cli.owning import Task, add_mode_options, carry, waits_for_person
from runner.cli.reading import check_all, read, show_findings, show_problems

if TYPE_CHECKING:
    from pathlib import Path

    from runner.host.launch import Order


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
    add_mode_options(parser)
    add_robot_options(parser)
    add_care_options(parser)


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
    from runner.host.launch import carry_out, planned
    from runner.host.process import start
    from runner.journal.errors import JournalError

    try:
        folder = _new_folder(order)
    except JournalError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    return carry(
        arguments,
        Task(
            folder,
            lambda board, after_turn: carry_out(order, folder, board, after_turn),
            lambda: start(planned(order, folder.name), folder),
        ),
    )


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
    care = care_of(arguments, waits_for_person(arguments))
    order = Order(mission, machine, conditions, source, arguments.seed, arguments.pace, care=care)
    if arguments.robot is None:
        return order
    if not area_is_clear(arguments.robot, arguments.area_clear):
        print("Nothing was driven.", file=sys.stderr)
        return None
    return replace(order, backend="link", line=line_of(arguments, arguments.robot))


def _new_folder(order: Order) -> Path:
    from datetime import datetime

    from runner.journal.runs import new_run, runs_folder

    return new_run(runs_folder(), order.mission.name, datetime.now())
