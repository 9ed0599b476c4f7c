"""`trundle link try`: the adapter trial, for a person and for a script."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import TextIO

import msgspec

from backends.contract import BackendError, Line
from backends.link.trial.attempt import Box
from backends.link.trial.running import Result, Trial, Verdict, box_in_words
from runner.cli.exits import Exit
from runner.cli.link import area_is_clear


class Report(msgspec.Struct, frozen=True):
    """The trial as JSON."""

    address: str
    robot: str
    results: list[Result]


def try_adapter(arguments: argparse.Namespace, line: Line) -> int:
    """Try it all. The exit code says whether every requirement that was tried is kept."""
    if not 0.05 <= arguments.speed <= 2.0 or not 0.5 <= arguments.ahead <= 10.0:
        raise BackendError("The trial moves a robot at 0.05 to 2 m/s, by 0.5 to 10 m.")
    trial = Trial.begin(line)
    try:
        print(f"{trial.about.name} at {line.address}", file=_words(arguments))
        box = None if arguments.standing else _box(trial, arguments)
        results = list(_shown(trial.run(box, _ask_restart if arguments.restart else None, arguments.only), arguments))
    finally:
        trial.close()
    if arguments.json:
        _write(arguments.json, Report(line.address, trial.about.name, results))
    failed = sum(result.verdict == Verdict.FAIL.value for result in results)
    passed = sum(result.verdict == Verdict.PASS.value for result in results)
    print(f"{passed} kept, {failed} not kept, {len(results) - passed - failed} not tried.", file=_words(arguments))
    return Exit.MISTAKE if failed else Exit.OK


def _words(arguments: argparse.Namespace) -> TextIO:
    """Where words for people go: out of the way of JSON."""
    return sys.stderr if arguments.json == "-" else sys.stdout


def _box(trial: Trial, arguments: argparse.Namespace) -> Box:
    box = trial.box(arguments.ahead, arguments.speed)
    print(box_in_words(box), file=sys.stderr)
    if not area_is_clear(arguments.address, arguments.area_clear, always=True):
        raise BackendError("Nothing was moved. To leave out what moves the robot: --standing")
    return box


def _shown(results: Iterator[Result], arguments: argparse.Namespace) -> Iterator[Result]:
    for result in results:
        print(f"{result.verdict:9}  {result.requirement:4} {result.text}", file=_words(arguments), flush=True)
        if result.why:
            print(f"{'':16}{result.why}", file=_words(arguments), flush=True)
        yield result


def _ask_restart() -> None:
    print("Restart the adapter now, then press Enter. ", end="", file=sys.stderr, flush=True)
    sys.stdin.readline()


def _write(where: str, report: Report) -> None:
    text = msgspec.json.format(msgspec.json.encode(report), indent=2).decode()
    if where == "-":
        print(text)
    else:
        Path(where).write_text(text + "\n", encoding="utf-8")
