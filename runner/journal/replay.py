"""What the record says, gone through again: the state it leads to, and whether the engine agrees with every entry.

The record holds all that the engine was ever told. So replaying it gives the state in which the run was left, which is
how a run is picked up, and it gives every command and note anew, which is how a record is verified.
"""

from __future__ import annotations

import heapq
from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass, field

from runner.engine.advance import advance
from runner.engine.codec import state_from_bytes
from runner.engine.state import EngineState, initial_state
from runner.engine.values import Command, Effect, Input, Note, Seen
from runner.journal.errors import JournalError
from runner.journal.reader import Entry, Record, Snapshot, chain_break
from runner.machine.codec import from_json
from runner.machine.table import Machine


@dataclass(frozen=True, slots=True)
class Parting:
    """Where the record and the engine part: the entry's number, and both sides in words."""

    entry: int
    stamp: float
    recorded: str
    replayed: str


@dataclass(frozen=True, slots=True)
class Verdict:
    """What `verify` found. `from_stamp` is above 0 where the older telemetry was dropped, so that the replay began
    later; the chain is checked from the first entry on all the same."""

    entries: int
    inputs: int
    from_stamp: float
    chain_broken_at: int | None
    parting: Parting | None

    @property
    def sound(self) -> bool:
        return self.chain_broken_at is None and self.parting is None


@dataclass(slots=True)
class _Follower:
    """The engine, following a record: what it made that the record has yet to show is in `owed`."""

    machine: Machine
    state: EngineState
    owed: deque[Effect] = field(default_factory=deque)
    entries: int = 0
    inputs: int = 0
    last: tuple[int, float] = (0, 0.0)

    def take(self, given: Input) -> None:
        self.state, effects = advance(self.machine, self.state, given)
        self.owed.extend(effects)
        self.inputs += 1


def state_at_end(record: Record) -> EngineState:
    """The state in which the run was left: the newest snapshot, and what came after it.

    JournalError where the record cannot be followed, with the entry at which it parts from the engine.
    """
    machine = machine_of(record)
    snapshot = next(iter(reversed(record.snapshots())), None)
    follower, parting = _follow(record, machine, snapshot)
    if parting is not None:
        raise JournalError(
            f"The record cannot be gone on with: at entry {parting.entry} it says {parting.recorded}, where the engine"
            f" has {parting.replayed}. It was written by another version of Trundle, or was changed."
        )
    return follower.state


def verify(record: Record) -> Verdict:
    """Check the chain, and replay every input that is there through the engine."""
    start = None if record.track_is_whole() else next(iter(record.snapshots()), None)
    follower, parting = _follow(record, machine_of(record), start)
    return Verdict(follower.entries, follower.inputs, start.stamp if start else 0.0, chain_break(record), parting)


def machine_of(record: Record) -> Machine:
    """The machine that the run ran. JournalError where this version cannot read it."""
    try:
        return from_json(record.machine_json)
    except ValueError as error:
        raise JournalError(f"The machine in {record.path} is of another version of Trundle: {error}.") from error


def _follow(record: Record, machine: Machine, start: Snapshot | None) -> tuple[_Follower, Parting | None]:
    follower = _Follower(machine, _state_of(start, machine))
    for one in _in_order(record, start):
        if isinstance(one, Seen):
            parting = _nothing_owed(follower, f"telemetry at {one.stamp:.2f} s")
            value: Input | Command | Note = one
        else:
            follower.entries += 1
            follower.last = (one.seq, one.stamp)
            value = one.value
            parting = _as_owed(follower, value) if one.kind != "input" else _nothing_owed(follower, repr(value))
        if parting is not None:
            return follower, parting
        if isinstance(value, Input):
            follower.take(value)
    return follower, _nothing_owed(follower, "its end")


def _state_of(start: Snapshot | None, machine: Machine) -> EngineState:
    if start is None:
        return initial_state(machine)
    try:
        return state_from_bytes(start.state)
    except ValueError as error:
        raise JournalError(str(error)) from error


def _in_order(record: Record, start: Snapshot | None) -> Iterator[Entry | Seen]:
    """Entries and telemetry in the order in which they came: after entry n stands the telemetry of n."""
    entry, row = (start.entry, start.track) if start else (0, 0)
    entries = (((one.seq, 0, 0), one) for one in record.entries(after=entry))
    track = (((one.after_entry, 1, one.seq), one.seen) for one in record.track(after=row))
    both: Iterator[tuple[tuple[int, int, int], Entry | Seen]] = heapq.merge(entries, track, key=lambda keyed: keyed[0])
    return (one for _, one in both)


def _nothing_owed(follower: _Follower, recorded: str) -> Parting | None:
    """An input came: everything that followed from the one before must have been recorded."""
    if not follower.owed:
        return None
    seq, stamp = follower.last
    return Parting(seq + 1, stamp, recorded, repr(follower.owed[0]))


def _as_owed(follower: _Follower, value: Input | Command | Note) -> Parting | None:
    """A command or note must be the next that the engine made."""
    owed = follower.owed.popleft() if follower.owed else None
    if value == owed:
        return None
    seq, stamp = follower.last
    return Parting(seq, stamp, repr(value), "nothing" if owed is None else repr(owed))
