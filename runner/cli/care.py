"""The options that say how a run looks after itself, for `run`; a run that is picked up has kept its own."""

from __future__ import annotations

import argparse
import shlex
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from runner.host.plan import Care

ATTENDED_S = 30.0


def add_care_options(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("unattended")
    group.add_argument(
        "--on-trouble",
        type=_hook,
        default=(),
        metavar="COMMAND",
        help="run this where the run needs a person, with the event as JSON on its input; or a web address to post to",
    )
    group.add_argument("--on-end", type=_hook, default=(), metavar="COMMAND", help="the same, when the run has ended")
    group.add_argument(
        "--wait-for-person",
        type=_seconds,
        metavar="SECONDS",
        help="how long a run in trouble is held before it ends (default: as long as it takes; with --plain not at all)",
    )
    group.add_argument(
        "--attended",
        type=_seconds,
        nargs="?",
        const=ATTENDED_S,
        metavar="SECONDS",
        help=f"hold the robot where nobody has watched for so long (default where it is given: {ATTENDED_S:g})",
    )
    group.add_argument("--track-hours", type=_hours, metavar="HOURS", help="keep no more telemetry than of so long")


def care_of(arguments: argparse.Namespace, patient: bool) -> Care:
    """The care asked for. A run that is `patient` waits for a person unless it is told for how long."""
    from runner.host.plan import Care

    patience = arguments.wait_for_person
    if patience is None and not patient:
        patience = 0.0
    return Care(arguments.on_trouble, arguments.on_end, patience, arguments.attended, arguments.track_hours)


def _hook(text: str) -> tuple[str, ...]:
    try:
        words = tuple(shlex.split(text))
    except ValueError as error:
        raise argparse.ArgumentTypeError(f"'{text}' cannot be split into words: {error}") from error
    if not words:
        raise argparse.ArgumentTypeError("write a command or a web address")
    return words


def _seconds(text: str) -> float:
    return _number(text, 0.0, 1e7, "a number of seconds")


def _hours(text: str) -> float:
    return _number(text, 0.5, 1e5, "a number of hours, at least 0.5")


def _number(text: str, least: float, most: float, wanted: str) -> float:
    try:
        number = float(text)
    except ValueError:
        number = -1.0
    if not least <= number <= most:
        raise argparse.ArgumentTypeError(f"'{text}' is not {wanted}")
    return number
