"""What one leg takes: the least there is, what is likely, and what its rule and its time limit let it take at most.

The most is read from the leg's own states: its tries, its recoveries, its rests, and how slow progress may be without
counting as a stall.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from runner.machine.leg import ACTION_TIME_S, REST
from runner.machine.spans import INFINITE, Cost, Span
from runner.machine.table import Action, Fragment, Timer, Verb
from runner.site.values import RobotDescription

LIKELY_FACTOR, LIKELY_S = 1.05, 2.5
"""A likely drive against a perfect one: so much longer for bends, so much more for turning at both ends. Measured on
the shipped sites; see tests/machine/test_estimates_simulated.py."""
DETOUR_FACTOR, DETOUR_M = 2.0, 10.0
"""The longest route that a robot is taken to drive, against the longest planned one between places of the mission."""
SETTLE_S = 10.0
"""What halting, planning and reporting may add to any leg."""


@dataclass(frozen=True, slots=True)
class Lengths:
    """Of a leg's route in meters: no way is shorter than `least`; the `likely` one; `most` over the whole mission."""

    least: float
    likely: float
    most: float


def drive_seconds(meters: float, speed: float, acceleration: float) -> float:
    """The shortest time from standing to standing, straight on."""
    if meters <= 0.0:
        return 0.0
    if meters * acceleration < speed * speed:
        return 2.0 * math.sqrt(meters / acceleration)
    return meters / speed + speed / acceleration


def drive_span(lengths: Lengths, speed: float, robot: RobotDescription) -> Span:
    """Seconds of the drive itself, whatever its limits: nothing in the way."""
    least = drive_seconds(lengths.least, speed, robot.acceleration)
    likely = LIKELY_FACTOR * drive_seconds(lengths.likely, speed, robot.acceleration) + LIKELY_S
    return Span(least, max(likely, least), INFINITE)


def leg_cost(fragment: Fragment, within: float | None, lengths: Lengths, speed: float, robot: RobotDescription) -> Cost:
    """Seconds, meters and watt-hours of a leg that arrives (least, likely) or ends however it may (most)."""
    drive = drive_span(lengths, speed, robot)
    most = most_seconds(fragment, within, lengths.most)
    seconds = Span(min(drive.least, most), min(drive.likely, most), most)
    meters = Span(lengths.least, lengths.likely, speed * most)
    return Cost(seconds, meters, seconds.each(lambda time: time * robot.battery.driving / 3600.0))


def time_limit(fragment: Fragment, within: float | None) -> float | None:
    """The shorter of the step's limit and the rule's."""
    bounds = [bound for bound in (within, _give_up(fragment)) if bound is not None]
    return min(bounds) if bounds else None


def most_seconds(fragment: Fragment, within: float | None, length: float) -> float:
    """The longest a leg can last, from its states: the first of its bounds to come."""
    limit = time_limit(fragment, within)
    longest = by_rule(fragment, length)
    return (longest if limit is None else min(longest, limit)) + SETTLE_S


def by_rule(fragment: Fragment, length: float) -> float:
    """Without time limits: creeping along the whole route, then every try and recovery in vain, each at its slowest."""
    watch = fragment.watch
    assert watch is not None, "the fragment of a leg watches progress"
    creeping = (
        math.ceil((DETOUR_FACTOR * length + DETOUR_M) / watch.progress) + 1 if math.isfinite(length) else INFINITE
    )
    recoveries, tries = fragment.recoveries_at_most, fragment.tries_at_most
    standing = (creeping + recoveries + tries) * watch.window
    return standing + recoveries * _longest_recovery(fragment) + _rests(fragment, tries)


def _give_up(fragment: Fragment) -> float | None:
    return next((action.amount for action in fragment.states[0].on_entry if action.timer is Timer.GIVE_UP), None)


def _longest_recovery(fragment: Fragment) -> float:
    entries = [state.on_entry for state in fragment.states if state.recovery]
    return max((_recovery_seconds(actions) for actions in entries), default=0.0)


def _recovery_seconds(actions: tuple[Action, ...]) -> float:
    rests = [action.amount or 0.0 for action in actions if action.verb is Verb.START and action.timer is Timer.REST]
    return rests[0] if rests else ACTION_TIME_S


def _rests(fragment: Fragment, tries: int) -> float:
    rest = next(action.rest for action in fragment.states[REST].on_entry if action.rest is not None)
    first, factor, most = rest
    return sum(min(most, first * factor**done) for done in range(tries - 1))
