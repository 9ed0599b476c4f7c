"""Whether the limits a mission sets can be kept, by its estimates: `end by`, `within`, and what the battery holds."""

from __future__ import annotations

import math
from collections.abc import Iterator

from runner.language.diagnostics import WHOLE_FILE, Diagnostic, Severity
from runner.language.mission import Mark, Mission
from runner.machine.estimates import Drain, Estimate
from runner.machine.findings import Finding
from runner.machine.leg_costs import time_limit
from runner.machine.spans import Span
from runner.machine.table import Machine, Verb
from runner.machine.wording import say_clock, say_roughly


def check_limits(mission: Mission, machine: Machine, estimate: Estimate) -> list[Finding]:
    """Findings on the end-by time, on the time limits of legs, and on the battery."""
    return [
        *_end_by(mission, machine, estimate),
        *_time_limits(machine, estimate),
        *_battery(mission, machine, estimate),
    ]


def _end_by(mission: Mission, machine: Machine, estimate: Estimate) -> Iterator[Finding]:
    whole = estimate.unbounded.seconds
    if machine.end_by is None or whole.least == math.inf:
        return
    mark = Mark(mission.start_mark.file, WHOLE_FILE, 1)
    rest = f"Begun at {say_clock(estimate.begins_clock)}, {say_roughly(estimate.available)} are left."
    for seconds, name, sentence, severity in (
        (whole.least, "end-by-missed", "even if nothing is in the way", Severity.ERROR),
        (whole.likely, "end-by-likely-missed", "as it will likely go", Severity.WARNING),
        (whole.most, "end-by-may-cut", "if everything goes wrong that can", Severity.NOTE),
    ):
        if seconds > estimate.available:
            end_by = say_clock(machine.end_by)
            taken = f"The mission takes {say_roughly(seconds)} {sentence}: past its end-by time, {end_by}."
            yield Finding(name, Diagnostic(mark, taken, rest, severity))
            return


def _time_limits(machine: Machine, estimate: Estimate) -> Iterator[Finding]:
    told: set[int] = set()
    for number, leg in estimate.legs.items():
        block = machine.blocks[number]
        limit = time_limit(machine.fragments[block.fragment], block.seconds)
        if limit is None or leg.step in told or limit >= leg.drive.likely:
            continue
        told.add(leg.step)
        yield _too_short(machine, leg.step, limit, leg.drive)


def _too_short(machine: Machine, step: int, limit: float, drive: Span) -> Finding:
    note = machine.steps[step]
    if limit < drive.least:
        sentence = (
            f'The time limit of "{note.text}", {say_roughly(limit)}, is shorter than the drive itself: '
            f"{say_roughly(drive.least)} at the least."
        )
        return Finding("within-too-short", Diagnostic(note.mark, sentence, "Give the leg more time."))
    sentence = (
        f'The time limit of "{note.text}", {say_roughly(limit)}, is shorter than the drive is likely to take: '
        f"{say_roughly(drive.likely)}."
    )
    return Finding("within-tight", Diagnostic(note.mark, sentence, "Give the leg more time.", Severity.WARNING))


def _battery(mission: Mission, machine: Machine, estimate: Estimate) -> Iterator[Finding]:
    if any(_charges(machine, order.entry[0]) for order in machine.orders):
        return
    for drain in estimate.drains:
        yield _drained(mission, machine, drain)


def _charges(machine: Machine, entry: int) -> bool:
    """Whether steps from a block on charge the battery somewhere."""
    seen, waiting = {entry}, [entry]
    while waiting:
        block = machine.blocks[waiting.pop()]
        if any(action.verb is Verb.CHARGE for action in machine.fragments[block.fragment].states[0].on_entry):
            return True
        for onward in [to[0] for _, to in block.exits] + [to[0] for to in block.branches]:
            if onward not in seen:
                seen.add(onward)
                waiting.append(onward)
    return False


def _drained(mission: Mission, machine: Machine, drain: Drain) -> Finding:
    note = machine.steps[drain.step]
    capacity = mission.robot.battery.capacity
    advice = "Charge before it, or add a standing order that charges when the battery is low."
    if drain.surely:
        sentence = f'The battery, {capacity:g} Wh, is empty by the end of "{note.text}", however well all goes.'
        return Finding("battery-too-small", Diagnostic(note.mark, sentence, advice))
    sentence = f'The battery, {capacity:g} Wh, is likely to be empty by the end of "{note.text}".'
    return Finding("battery-may-not-last", Diagnostic(note.mark, sentence, advice, Severity.WARNING))
