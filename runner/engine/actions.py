"""What each verb of the table does to the state, and which commands and notes come of it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from runner.engine.diagnosis import Evidence, diagnose, near
from runner.engine.draft import Draft, next_clock, without
from runner.engine.progress import Progress
from runner.engine.state import Incident, Leg, Loop
from runner.engine.values import (
    Clear,
    EaseBack,
    Ended,
    Go,
    Halt,
    IncidentBegan,
    IncidentEnded,
    LegBegan,
    LegEnded,
    RecoveryBegan,
    Relocate,
    Replan,
    StepBegan,
    TryFailed,
)
from runner.machine.table import Action, Ending, Event, Outcome, Register, State, Timer, Verb

ENDING_REASONS: dict[Ending, str] = {
    Ending.COMPLETED: "all steps done",
    Ending.LEG_FAILED: "a leg failed, and the mission was to end in that case",
    Ending.TIMED_OUT: "the end-by time came",
    Ending.ABORTED: "aborted by a person",
}

_UNRECOVERED: dict[Outcome, str] = {
    Outcome.FAILED: "nothing: the leg failed",
    Outcome.SKIPPED: "nothing: a person skipped the leg",
    Outcome.ABORTED: "nothing: the mission ended",
}


def act(draft: Draft, action: Action, event: Event, detail: str) -> None:
    """Carry out one action of a row taken at `event`, of which the robot said `detail`."""
    if action.verb is Verb.OPEN_INCIDENT:
        _open_incident(draft, event, detail)
    else:
        _VERBS[action.verb](draft, action)


def begin_step(draft: Draft, step: int) -> None:
    """Note that a step began, with the laps of the loops around it."""
    note = draft.machine.steps[step]
    draft.state.step = step
    laps = tuple(draft.state.loops[loop].laps for loop in note.loops)
    draft.effects.append(StepBegan(step, note.text, note.mark.line, laps))


def begin_recovery(draft: Draft, state: State) -> None:
    """Note that a recovery is being tried; if progress comes now, it is the one that helped."""
    incident = draft.state.incident
    if incident is None:
        return
    attempts = incident.attempts + 1
    draft.state.incident = replace(incident, attempts=attempts, helper=state.name)
    tries = draft.state.registers[Register.TRIES]
    draft.effects.append(RecoveryBegan(incident.number, incident.leg, state.name, state.recovery, attempts, tries))


# --- commands to the robot ----------------------------------------------------------------------------------------


def _drive(draft: Draft, _: Action) -> None:
    state = draft.state
    state.progress = Progress(mark_stamp=draft.stamp)
    if state.goal is not None:
        return
    place = draft.block().place
    assert place is not None, "the compiler gives every leg its place"
    target = draft.machine.places[place]
    state.goals_sent += 1
    state.goal = state.goals_sent
    draft.effects.append(Go(state.goal, target.name, target.pose, draft.machine.speed))


def _halt(draft: Draft, _: Action) -> None:
    """Halting ends the goal and the action at the robot, so what it says of them later is old news."""
    draft.state.goal = None
    draft.state.action = None
    draft.state.timers = without(draft.state.timers, Timer.ACTION)
    draft.effects.append(Halt())


def _clear(draft: Draft, action: Action) -> None:
    draft.effects.append(Clear(_next_action(draft), action.amount or 0.0))


def _replan(draft: Draft, _: Action) -> None:
    draft.effects.append(Replan(_next_action(draft)))


def _ease_back(draft: Draft, action: Action) -> None:
    draft.effects.append(EaseBack(_next_action(draft), action.amount or 0.0))


def _relocate(draft: Draft, _: Action) -> None:
    draft.effects.append(Relocate(_next_action(draft)))


def _next_action(draft: Draft) -> int:
    draft.state.actions_asked += 1
    draft.state.action = draft.state.actions_asked
    return draft.state.action


# --- registers ----------------------------------------------------------------------------------------------------


def _start(draft: Draft, action: Action) -> None:
    seconds = draft.block().seconds if action.amount is None else action.amount
    if seconds is not None:
        _set_timer(draft, action, seconds)


def _stop(draft: Draft, action: Action) -> None:
    draft.state.timers = without(draft.state.timers, action.timer)


def _start_rest(draft: Draft, action: Action) -> None:
    assert action.rest is not None, "the compiler writes the rest out"
    if action.timer in draft.state.timers:
        return
    first, factor, most = action.rest
    tries = draft.state.registers[Register.TRIES]
    seconds = min(most, first * factor ** (tries - 1))
    _set_timer(draft, action, seconds)
    if draft.state.leg is not None:
        draft.effects.append(TryFailed(draft.state.leg.number, tries, seconds))
    if draft.state.incident is not None:
        draft.state.incident = replace(draft.state.incident, helper="a new try")


def _set_timer(draft: Draft, action: Action, seconds: float) -> None:
    """Start a timer. One that still runs, in a state that is resumed, goes on."""
    assert action.timer is not None, "the compiler names the timer"
    if action.timer not in draft.state.timers:
        draft.state.timers = {**draft.state.timers, action.timer: draft.stamp + seconds}


def _set(draft: Draft, action: Action) -> None:
    assert action.register is not None, "the compiler names the register"
    draft.state.registers = {**draft.state.registers, action.register: int(action.amount or 0)}


def _add(draft: Draft, action: Action) -> None:
    assert action.register is not None, "the compiler names the register"
    value = draft.state.registers[action.register] + int(action.amount or 0)
    draft.state.registers = {**draft.state.registers, action.register: value}


def _enter_loop(draft: Draft, _: Action) -> None:
    block, now = draft.block(), draft.stamp + draft.state.clock
    ends = float("inf")
    if block.clock is not None:
        ends = next_clock(block.clock, now)
    elif block.seconds is not None:
        ends = now + block.seconds
    draft.state.loops = {**draft.state.loops, draft.state.address[0]: Loop(0, ends)}


def _count_lap(draft: Draft, _: Action) -> None:
    number = draft.state.address[0]
    loop = draft.state.loops[number]
    draft.state.loops = {**draft.state.loops, number: replace(loop, laps=loop.laps + 1)}


# --- legs, incidents, the end -------------------------------------------------------------------------------------


def _begin_leg(draft: Draft, _: Action) -> None:
    block = draft.block()
    assert block.place is not None, "the compiler gives every leg its place"
    assert block.step is not None, "and its step"
    place = draft.machine.places[block.place].name
    draft.state.legs += 1
    draft.state.leg = Leg(draft.state.legs, block.step, place, draft.stamp, draft.driven())
    draft.effects.append(LegBegan(draft.state.legs, block.step, place))


def _end_leg(draft: Draft, action: Action) -> None:
    assert action.outcome is not None, "the compiler gives every end of a leg its outcome"
    _finish_leg(draft, action.outcome, action.reason)


def _skip_leg(draft: Draft, _: Action) -> None:
    _finish_leg(draft, Outcome.SKIPPED, "skipped by a person")


def _finish_leg(draft: Draft, outcome: Outcome, reason: str) -> None:
    state, leg = draft.state, draft.state.leg
    if leg is None:
        return
    if state.incident is not None:
        helped = state.incident.helper or "arrival"
        _finish_incident(draft, recovered=outcome is Outcome.ARRIVED, ended_by=_UNRECOVERED.get(outcome, helped))
    tries, recoveries = (state.registers.get(name, 0) for name in (Register.TRIES, Register.RECOVERIES))
    seconds, meters = draft.stamp - leg.began, draft.driven() - leg.driven
    draft.effects.append(LegEnded(leg.number, leg.step, leg.place, outcome, reason, seconds, meters, tries, recoveries))
    state.leg = None
    state.timers = {}
    state.legs_arrived += outcome is Outcome.ARRIVED
    state.legs_failed += outcome is Outcome.FAILED


def _open_incident(draft: Draft, event: Event, detail: str) -> None:
    """Trouble on trouble is the same incident, so only the first sign opens one."""
    state, leg, seen = draft.state, draft.state.leg, draft.state.seen
    if state.incident is not None or leg is None:
        return
    pose = seen.pose if seen else None
    around = near(seen.obstacles, pose) if seen else ()
    state.incidents += 1
    state.incident = Incident(state.incidents, leg.number, draft.stamp, event, detail, around)
    remaining = seen.remaining if seen else None
    draft.effects.append(IncidentBegan(state.incidents, leg.number, event, detail, pose, remaining))


def _close_incident(draft: Draft, _: Action) -> None:
    """Progress ended the trouble: whatever was tried last has helped."""
    if draft.state.incident is not None:
        _finish_incident(draft, recovered=True, ended_by=draft.state.incident.helper or "progress")


def _finish_incident(draft: Draft, *, recovered: bool, ended_by: str) -> None:
    incident = draft.state.incident
    assert incident is not None, "asked only while an incident is open"
    after = draft.state.seen.obstacles if draft.state.seen else ()
    evidence = Evidence(incident.sign, incident.detail, incident.obstacles, after, recovered, incident.helper)
    name, reasons = diagnose(evidence)
    seconds = draft.stamp - incident.began
    draft.effects.append(IncidentEnded(incident.number, incident.leg, recovered, ended_by, seconds, name, reasons))
    draft.state.incident = None


def _end_mission(draft: Draft, action: Action) -> None:
    assert action.ending is not None, "the compiler gives every end its kind"
    reason = ENDING_REASONS[action.ending]
    _finish_leg(draft, Outcome.ABORTED, reason)
    draft.state.ended = action.ending
    draft.state.timers = {}
    draft.effects.append(Ended(action.ending, reason))


_VERBS: dict[Verb, Callable[[Draft, Action], None]] = {
    Verb.DRIVE: _drive,
    Verb.HALT: _halt,
    Verb.CLEAR: _clear,
    Verb.REPLAN: _replan,
    Verb.EASE_BACK: _ease_back,
    Verb.RELOCATE: _relocate,
    Verb.START: _start,
    Verb.STOP: _stop,
    Verb.START_REST: _start_rest,
    Verb.SET: _set,
    Verb.ADD: _add,
    Verb.BEGIN_LEG: _begin_leg,
    Verb.END_LEG: _end_leg,
    Verb.SKIP_LEG: _skip_leg,
    Verb.CLOSE_INCIDENT: _close_incident,
    Verb.ENTER_LOOP: _enter_loop,
    Verb.COUNT_LAP: _count_lap,
    Verb.END_MISSION: _end_mission,
}
