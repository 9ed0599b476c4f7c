"""Requirements whose trial moves the robot, in its box and slowly.

Each attempt has connections of its own and a session of its own; the trial closes them, which halts the robot.
"""

from __future__ import annotations

from math import hypot

from backends.link.messages import ENDS, Stand
from backends.link.trial.attempt import Attempt
from backends.link.trial.probe import FailedError, Probe

STOPPING_S = 3.0
"""Time that a robot at the trial's slow speed may take from being told to stop to standing."""
ALLOWED_M = 0.03
"""A robot that has driven no more than this between two looks stands."""
NEAR_M = 0.35
"""How far from its goal a robot that says it arrived may be."""


def _stands(probe: Probe, why: str) -> None:
    """The robot stands, suspended. `frozen` is set, so that it is looked at with beats that are no signs of life."""
    probe.until(
        lambda: probe.state is not None and probe.state.suspended, 1.0, f"the robot did not say `suspended` {why}"
    )
    probe.until(lambda: probe.state is not None and probe.state.standing, STOPPING_S, f"the robot did not stand {why}")
    before = probe.telemetry[-1].driven
    probe.pump(1.0, beats=True)
    if probe.telemetry[-1].driven - before > ALLOWED_M:
        raise FailedError(f"The robot drove on {why}, though it had said that it stood.")


def stops_in_silence(attempt: Attempt) -> None:
    probe, _, _ = attempt.driving()
    probe.frozen = probe.heard
    probe.pump(attempt.about.silence + 0.5)
    _stands(probe, "after its controller was silent")


def stops_for_old_beats(attempt: Attempt) -> None:
    probe, _, _ = attempt.driving()
    probe.frozen = probe.heard
    probe.pump(attempt.about.silence + 0.5, beats=True)
    _stands(probe, "though all beats were old")


def goes_on(attempt: Attempt) -> None:
    probe, goal, pose = attempt.driving()
    assert attempt.box is not None
    probe.pump(attempt.about.silence + 0.5)
    probe.pump(1.0, beats=True)
    before = probe.telemetry[-1].driven
    probe.pump(0.7, beats=True)
    if probe.telemetry[-1].driven - before > ALLOWED_M:
        raise FailedError("The robot drove on by itself when beats came again.")
    if (outcome := probe.go(goal, pose, attempt.box.speed)) != "taken":
        raise FailedError(f"The suspended goal, sent again, was answered `{outcome}`, not `taken`.")
    _arrives(probe, goal, pose)


def _arrives(probe: Probe, goal: int, pose: Stand) -> None:
    def ended() -> bool:
        state = probe.state
        return state is not None and state.goal is not None and state.goal.id == goal and state.goal.status in ENDS

    probe.until(ended, 60.0, "the goal did not end")
    assert probe.state is not None
    assert probe.state.goal is not None
    if (status := probe.state.goal.status) != "arrived":
        raise FailedError(f"The goal ended `{status}`: {probe.state.goal.reason or 'no reason given'}")
    probe.pump(0.3, beats=True)
    at = probe.telemetry[-1].pose
    if hypot(at[0] - pose[0], at[1] - pose[1]) > NEAR_M:
        raise FailedError(
            f"It says `arrived`, but stands {hypot(at[0] - pose[0], at[1] - pose[1]):.2f} m from its goal."
        )
    if not probe.state.standing:
        raise FailedError("It says `arrived`, but does not stand.")


def drives(attempt: Attempt) -> None:
    probe, goal, pose = attempt.driving()
    _arrives(probe, goal, pose)
    before = probe.state.goal if probe.state else None
    probe.halt()
    probe.pump(0.5, beats=True)
    if probe.state is None or probe.state.goal != before:
        raise FailedError("The status of a goal changed after it had ended.")


def not_twice(attempt: Attempt) -> None:
    assert attempt.box is not None
    probe, goal, pose = attempt.driving()
    _arrives(probe, goal, pose)
    away, before = attempt.box.far(pose), probe.telemetry[-1].driven
    for again, expected in ((goal, "known"), (goal - 1 if goal > 0 else goal, "old" if goal > 0 else "known")):
        if (outcome := probe.go(again, away, attempt.box.speed)) != expected:
            raise FailedError(f"Goal {again} was answered `{outcome}` after goal {goal}, not `{expected}`.")
    probe.pump(1.0, beats=True)
    if probe.telemetry[-1].driven - before > ALLOWED_M:
        raise FailedError("A goal that was given before was driven again.")


def halts(attempt: Attempt) -> None:
    probe, goal, _ = attempt.driving()
    probe.halt()

    def halted() -> bool:
        state = probe.state
        return state is not None and state.goal is not None and state.goal.status == "halted" and state.standing

    probe.until(halted, STOPPING_S, f"goal {goal} was not `halted` and the robot standing after a halt")
    before = probe.telemetry[-1].driven
    probe.pump(1.0, beats=True)
    if probe.telemetry[-1].driven - before > ALLOWED_M:
        raise FailedError("The robot drove on after a halt.")
