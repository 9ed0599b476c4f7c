"""What each verb of the table does to the state, and which commands and notes come of it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from hashlib import sha256
from math import ceil, dist

from runner.engine.diagnosis import Evidence, diagnose, near
from runner.engine.draft import Draft, without
from runner.engine.progress import Progress
from runner.engine.state import INFINITE, Incident, Leg, Loop, Visiting
from runner.engine.values import (
    Answered,
    Asked,
    Clear,
    Counted,
    EaseBack,
    Ended,
    Go,
    Halt,
    IncidentBegan,
    IncidentEnded,
    LegBegan,
    LegEnded,
    Notified,
    RecoveryBegan,
    Relocate,
    Replan,
    StartCharging,
    StepBegan,
    TryFailed,
)
from runner.language.mission import Order
from runner.machine.table import Action, Ending, Event, Outcome, Register, State, Timer, Verb

ENDING_REASONS: dict[Ending, str] = {
    Ending.COMPLETED: "all steps done",
    Ending.LEG_FAILED: "a leg failed, and the mission was to end in that case",
    Ending.GIVEN_UP: "given up, as written",
    Ending.TIMED_OUT: "the end-by time came",
    Ending.ABORTED: "aborted by a person",
}

_UNRECOVERED: dict[Outcome, str] = {
    Outcome.FAILED: "nothing: the leg failed",
    Outcome.SKIPPED: "nothing: a person skipped the leg",
    Outcome.ABORTED: "nothing: the mission ended",
    Outcome.INTERRUPTED: "nothing: a standing order began the step anew",
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
    draft.effects.append(Go(state.goal, target.name, target.pose, draft.machine.speed, draft.block().relative))


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
    now, seconds = draft.clock(), draft.block().seconds
    loop = Loop(entered=now, ends=INFINITE if seconds is None else now + seconds)
    draft.state.loops = {**draft.state.loops, draft.state.address[0]: loop}


def _count_lap(draft: Draft, _: Action) -> None:
    number = draft.state.address[0]
    loop = draft.state.loops[number]
    due = draft.stamp + (draft.block().every or 0.0)
    draft.state.loops = {**draft.state.loops, number: replace(loop, laps=loop.laps + 1, due=due)}


def _start_lap(draft: Draft, action: Action) -> None:
    """Wait until the next lap is due. One that is overdue begins at once, or at the next full interval."""
    block, loop = draft.block(), draft.state.loops[draft.state.address[0]]
    late = draft.stamp - loop.due
    if block.wait_for_interval and late > 0.0 and block.every:
        late -= ceil(late / block.every) * block.every
    _set_timer(draft, action, max(0.0, -late))


# --- visits, questions and other steps ----------------------------------------------------------------------------


def _begin_visit(draft: Draft, _: Action) -> None:
    number, block = draft.state.address[0], draft.block()
    begun = draft.state.visits.get(number, Visiting()).begun + 1
    left = tuple(range(len(block.branches)))
    if block.order is Order.SHUFFLED:
        left = tuple(sorted(left, key=lambda index: _lot(draft.state.seed, number, begun, index)))
    draft.state.visits = {**draft.state.visits, number: Visiting(begun, left)}


def _lot(*numbers: int) -> bytes:
    """A number drawn by these numbers alone, so that the engine needs no source of chance."""
    return sha256(",".join(map(str, numbers)).encode()).digest()


def _pick_place(draft: Draft, _: Action) -> None:
    number, block = draft.state.address[0], draft.block()
    visit = draft.state.visits[number]
    if not visit.left:
        draft.state.visits = {**draft.state.visits, number: replace(visit, now=None)}
        return
    now = visit.left[0]
    if block.order is Order.NEAREST:
        now = min(visit.left, key=lambda index: (_way_to(draft, block.branch_places[index]), index))
    left = tuple(index for index in visit.left if index != now)
    draft.state.visits = {**draft.state.visits, number: replace(visit, left=left, now=now)}


def _way_to(draft: Draft, place: int) -> float:
    """Meters to a place: of route from the place last arrived at; else straight, from where the robot stands."""
    state = draft.state
    if state.here is not None:
        return draft.machine.lengths[state.here][place]
    pose = draft.machine.places[place].pose
    return 0.0 if state.seen is None else dist((pose.x, pose.y), (state.seen.pose.x, state.seen.pose.y))


def _ask(draft: Draft, _: Action) -> None:
    """Ask, with the time that is left: all of it, or, when asked again, what the interruption left."""
    block, deadline = draft.block(), draft.state.timers.get(Timer.UP_TO)
    left = block.seconds or 0.0 if deadline is None else deadline - draft.stamp
    draft.state.answer = ""
    draft.effects.append(Asked(block.text, block.answers, left, block.word))


def _silence(draft: Draft, _: Action) -> None:
    draft.state.answer = draft.block().word
    draft.effects.append(Answered(draft.state.answer, ""))


def _charge(draft: Draft, _: Action) -> None:
    draft.effects.append(StartCharging())


def _count(draft: Draft, _: Action) -> None:
    block = draft.block()
    value = draft.state.counts.get(block.word, 0) + block.by
    draft.state.counts = {**draft.state.counts, block.word: value}
    draft.effects.append(Counted(block.word, value))


def _notify(draft: Draft, _: Action) -> None:
    draft.effects.append(Notified(draft.block().text))


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
    finish_leg(draft, action.outcome, action.reason)


def _skip_leg(draft: Draft, _: Action) -> None:
    """What was skipped leaves no timer behind, be it a leg or a wait."""
    finish_leg(draft, Outcome.SKIPPED, "skipped by a person")
    draft.state.timers = {}


def finish_leg(draft: Draft, outcome: Outcome, reason: str) -> None:
    """End the leg under way, if there is one, and the incident with it."""
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
    state.here = _place_arrived_at(draft) if outcome is Outcome.ARRIVED else None
    if outcome is not Outcome.INTERRUPTED:
        state.last_leg = outcome


def _place_arrived_at(draft: Draft) -> int | None:
    block = draft.block()
    return None if block.relative else block.place


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
    reason = draft.block().text or ENDING_REASONS[action.ending]
    finish_leg(draft, Outcome.ABORTED, reason)
    interrupted = draft.state.interrupted
    if interrupted is not None:
        draft.state.leg, draft.state.incident = interrupted.leg, interrupted.incident
        draft.state.registers = interrupted.registers
        finish_leg(draft, Outcome.ABORTED, reason)
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
    Verb.START_LAP: _start_lap,
    Verb.BEGIN_VISIT: _begin_visit,
    Verb.PICK_PLACE: _pick_place,
    Verb.ASK: _ask,
    Verb.SILENCE: _silence,
    Verb.CHARGE: _charge,
    Verb.COUNT: _count,
    Verb.NOTIFY: _notify,
    Verb.END_MISSION: _end_mission,
}
