"""What is proved on the table before a wheel turns: totality, reachability, and that time passes in every loop.

- Totality: in every state the machine can wait in, every event that can reach it has a row. Which events can reach a
  state follows from what may be outstanding there: a goal at the robot, an action, running timers, a person.
- Reachability: every block can be come to from the start, and every state of a fragment from its entrances.
- Time: from every state, rows taken at once lead to a state that waits. No way round leads back without waiting.

Fragments are checked once each, whatever the number of their instances, so the work is linear in the blocks.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from runner.language.collection import collection_off
from runner.language.diagnostics import WHOLE_FILE, Diagnostic
from runner.language.mission import Mark
from runner.machine.findings import Finding
from runner.machine.table import (
    ALWAYS,
    GOAL_ENDS,
    TIMER_EVENTS,
    Action,
    Address,
    Block,
    Event,
    Exit,
    Fragment,
    Machine,
    State,
    Timer,
    Verb,
)

GOAL, ACTION = "a goal under way", "an action under way"

Outstanding = frozenset[str | Timer]
"""What may be going on in a state: a goal, an action, timers."""

PERSON = (Event.HOLD, Event.SKIP, Event.ABORT, Event.END_BY_TIME)

_ASKING = (Verb.CLEAR, Verb.REPLAN, Verb.EASE_BACK, Verb.RELOCATE)

_ENDS_GOAL = {Event.ARRIVED, *GOAL_ENDS}
_ENDS_ACTION = {Event.ACTION_DONE, Event.ACTION_FAILED}


@collection_off()
def check_table(machine: Machine) -> list[Finding]:
    """Every finding on the table; none means that each of the three properties holds."""
    entered = entrances(machine)
    findings = [
        finding
        for name, fragment in machine.fragments.items()
        for finding in _check_fragment(machine, fragment, entered.get(name, {0}))
    ]
    findings += _dangling_exits(machine)
    if not findings:
        findings += _unreachable_blocks(machine)
        findings += _timeless_loops(machine, entered)
    return findings


def entrances(machine: Machine) -> dict[str, set[int]]:
    """For each fragment, the local states at which its blocks are entered from elsewhere."""
    found: dict[str, set[int]] = {}
    addresses = [machine.start, *(order.entry for order in machine.orders), *(to for _, to in machine.exits)]
    for block in machine.blocks:
        addresses += [*(to for _, to in block.exits), *block.branches]
    for number, local in addresses:
        found.setdefault(machine.blocks[number].fragment, set()).add(local)
    return found


def outstanding(fragment: Fragment, entered: Iterable[int]) -> dict[int, Outstanding]:
    """What may be going on in each state of a fragment, by going round its rows until nothing new turns up."""
    found: dict[int, Outstanding] = {}
    waiting: list[tuple[int, Outstanding]] = [(entrance, frozenset()) for entrance in sorted(entered)]
    while waiting:
        number, before = waiting.pop()
        state = fragment.states[number]
        inside = _after(state.on_entry, before) | found.get(number, frozenset())
        if inside == found.get(number):
            continue
        found[number] = inside
        waiting += _followers(state, inside)
    return found


def _followers(state: State, inside: Outstanding) -> Iterator[tuple[int, Outstanding]]:
    for row in state.rows:
        if isinstance(row.target, int):
            yield row.target, _after(row.actions, _happened(row.event, inside))
    if state.rows and waits(state):
        yield state.resume, frozenset(thing for thing in inside if thing in (Timer.LEG, Timer.GIVE_UP))
        yield state.restart, frozenset()


def _happened(event: Event, inside: Outstanding) -> Outstanding:
    over: set[str | Timer] = {timer for timer, raised in TIMER_EVENTS.items() if raised is event}
    if event in _ENDS_GOAL:
        over.add(GOAL)
    if event in _ENDS_ACTION:
        over.add(ACTION)
    return inside - over


def _after(actions: Iterable[Action], inside: Outstanding) -> Outstanding:
    for action in actions:
        match action.verb:
            case Verb.DRIVE:
                inside |= {GOAL}
            case Verb.HALT:
                inside -= {GOAL, ACTION, Timer.ACTION}
            case Verb.STOP:
                inside -= {action.timer or ""}
            case Verb.START | Verb.START_REST | Verb.START_LAP:
                inside |= {action.timer or ""}
            case Verb.END_LEG | Verb.SKIP_LEG | Verb.END_MISSION:
                inside = frozenset()
            case verb if verb in _ASKING:
                inside |= {ACTION}
    return inside


def expected_events(state: State, inside: Outstanding) -> set[Event]:
    """The events that can reach a state in which the machine waits, while those things may be going on."""
    events: set[Event] = set(PERSON)
    events |= {event for timer, event in TIMER_EVENTS.items() if timer in inside}
    if GOAL in inside:
        events |= _ENDS_GOAL
    if ACTION in inside:
        events |= _ENDS_ACTION
    if any(action.verb is Verb.DRIVE for action in state.on_entry):
        events |= {Event.STALLED, Event.SWAYING, Event.PROGRESSED}
    if any(action.verb is Verb.ASK for action in state.on_entry):
        events.add(Event.ANSWERED)
    if state.watches:
        events.add(Event.CONDITION_MET)
    return events


def _check_fragment(machine: Machine, fragment: Fragment, entered: Iterable[int]) -> Iterator[Finding]:
    anywhere = {row.event for row in machine.anywhere}
    found = outstanding(fragment, entered)
    for number, state in enumerate(fragment.states):
        where = f"state '{state.name}' of '{fragment.name}'"
        if number not in found:
            yield _fault(machine, None, "unreachable-state", f"{where} can never be reached")
        elif not state.rows:
            continue
        elif waits(state):
            answered = {row.event for row in state.rows if row.guard == ALWAYS} | anywhere
            for event in sorted(expected_events(state, found[number]) - answered, key=lambda event: event.value):
                yield _fault(machine, None, "no-way-out", f"{where} has no row for '{event.value}'")
        elif [row for row in state.rows if row.event is Event.AT_ONCE][-1].guard != ALWAYS:
            yield _fault(machine, None, "no-way-out", f"{where} has no row for the case that none of its guards holds")


def waits(state: State) -> bool:
    """Whether time can pass in a state."""
    return all(row.event is not Event.AT_ONCE for row in state.rows)


_RETURNS = {Exit.RETURN, Exit.RETURN_SKIPPED, Exit.ORDER_RETURN, Exit.ORDER_REPEAT}


def _dangling_exits(machine: Machine) -> Iterator[Finding]:
    shared = {exit_ for exit_, _ in machine.exits} | _RETURNS
    used = {name: _exits_used(fragment) for name, fragment in machine.fragments.items()}
    skippable = {name: _skippable(fragment) for name, fragment in machine.fragments.items()}
    for block in machine.blocks:
        wired = {exit_ for exit_, _ in block.exits} | ({Exit.BRANCH} if block.branches else set())
        for exit_ in sorted(used[block.fragment] - wired - shared, key=lambda exit_: exit_.value):
            yield _fault(
                machine, block, "no-way-out", f"the exit '{exit_.value}' of {_name(machine, block)} leads nowhere"
            )
        if Exit.SKIPPED not in wired and skippable[block.fragment]:
            yield _fault(machine, block, "no-way-out", f"{_name(machine, block)} cannot be skipped")


def _skippable(fragment: Fragment) -> bool:
    """Whether a person can skip while time passes in it, and so leave it through its exit for that."""
    return any(
        state.rows and waits(state) and all(row.event is not Event.SKIP for row in state.rows)
        for state in fragment.states
    )


def _exits_used(fragment: Fragment) -> set[Exit]:
    return {row.target for state in fragment.states for row in state.rows if isinstance(row.target, Exit)}


def _unreachable_blocks(machine: Machine) -> Iterator[Finding]:
    seen = {machine.start[0], *(to[0] for _, to in machine.exits), *(order.entry[0] for order in machine.orders)}
    waiting = list(seen)
    while waiting:
        block = machine.blocks[waiting.pop()]
        for onward, _ in (*(to for _, to in block.exits), *block.branches):
            if onward not in seen:
                seen.add(onward)
                waiting.append(onward)
    for index, block in enumerate(machine.blocks):
        if index not in seen and block.step is not None:
            yield _fault(machine, block, "unreachable-step", f"{_name(machine, block)} can never be reached")


def _timeless_loops(machine: Machine, entered: Mapping[str, set[int]]) -> Iterator[Finding]:
    """Follow rows taken at once from every entrance; coming back to a state on the way is a loop without time."""
    passes = {
        name: {entrance: frozenset(_crossed(fragment, entrance)) for entrance in entered.get(name, {0})}
        for name, fragment in machine.fragments.items()
    }
    done: set[Address] = set()
    for number in range(len(machine.blocks)):
        for local in sorted(entered.get(machine.blocks[number].fragment, ())):
            looped = _loop_from(machine, passes, (number, local), done)
            if looped is not None:
                culprit = machine.blocks[looped[0]]
                yield _fault(
                    machine, culprit, "no-time-passes", f"{_name(machine, culprit)} can go round without time passing"
                )
                return


Passes = Mapping[int, frozenset[Exit]]


def _loop_from(machine: Machine, passes: Mapping[str, Passes], start: Address, done: set[Address]) -> Address | None:
    """Depth-first over timeless passages; `done` holds addresses proved free of loops."""
    path: list[tuple[Address, Iterator[Address]]] = [(start, _onward(machine, passes, start))]
    on_path = {start}
    while path:
        address, onward = path[-1]
        following = next(onward, None)
        if following is None:
            path.pop()
            on_path.discard(address)
            done.add(address)
        elif following in on_path:
            return following
        elif following not in done:
            on_path.add(following)
            path.append((following, _onward(machine, passes, following)))
    return None


def _onward(machine: Machine, passes: Mapping[str, Passes], address: Address) -> Iterator[Address]:
    block = machine.blocks[address[0]]
    crossed = passes[block.fragment].get(address[1], frozenset())
    branches = block.branches if Exit.BRANCH in crossed else ()
    return iter([*(to for exit_, to in block.exits if exit_ in crossed), *branches])


def _crossed(fragment: Fragment, entrance: int) -> Iterator[Exit]:
    seen, waiting = {entrance}, [entrance]
    while waiting:
        for row in fragment.states[waiting.pop()].rows:
            if row.event is not Event.AT_ONCE:
                continue
            if isinstance(row.target, Exit):
                yield row.target
            elif row.target is not None and row.target not in seen:
                seen.add(row.target)
                waiting.append(row.target)


def _name(machine: Machine, block: Block) -> str:
    return f'the step "{machine.steps[block.step].text}"' if block.step is not None else f'"{block.fragment}"'


def _fault(machine: Machine, block: Block | None, name: str, sentence: str) -> Finding:
    """`block` is the one to blame, None where the machine itself is."""
    step = block.step if block else None
    mark = machine.steps[step].mark if step is not None else Mark(machine.steps[0].mark.file, WHOLE_FILE, 1)
    return Finding(name, Diagnostic(mark, sentence[0].upper() + sentence[1:] + "."))
