"""The machine as people read it: a table in plain text, and graphs for DOT and Mermaid. All from the same rows."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from difflib import unified_diff

from runner.machine.codec import to_json
from runner.machine.table import ALWAYS, Action, Address, Block, Exit, Guard, Machine, Row, State, Test
from runner.machine.wording import say_clock, say_seconds


def as_text(machine: Machine) -> str:
    """Each fragment once, with its rows; then the blocks: which fragment, which step, and where each exit leads."""
    return "\n".join([*_heading(machine), "", *_fragments(machine), *_wiring(machine)]) + "\n"


def _heading(machine: Machine) -> Iterator[str]:
    yield f"machine: {machine.name}"
    yield f"start: {_where(machine, machine.start)}"
    yield f"speed at most: {machine.speed:g} m/s"
    if machine.end_by is not None:
        yield f"end by: {say_clock(machine.end_by)}"


def _fragments(machine: Machine) -> Iterator[str]:
    for fragment in machine.fragments.values():
        yield f"[{fragment.name}]"
        if fragment.watch is not None:
            watch = fragment.watch
            yield f"  stalled: under {watch.progress:g} m of progress in {say_seconds(watch.window)}"
        for number, state in enumerate(fragment.states):
            yield f"  {number} {state.name}"
            yield from (f"      on entry: {_action(action)}" for action in state.on_entry)
            yield from (f"      {_row(row, fragment.states)}" for row in state.rows)
        yield ""
    yield "[in every state, unless it has a row of its own]"
    yield from (f"      {_row(row, ())}" for row in machine.anywhere)
    yield ""


def _row(row: Row, states: tuple[State, ...]) -> str:
    target = "stay" if row.target is None else _target(row.target, states)
    guard = "" if row.guard == ALWAYS else f" if {_guard(row.guard)}"
    actions = "".join(f"; {_action(action)}" for action in row.actions)
    return f"{row.event.value}{guard} -> {target}{actions}"


def _target(target: int | Exit, states: tuple[State, ...]) -> str:
    return f"exit {target.value}" if isinstance(target, Exit) else f"{target} {states[target].name}"


def _guard(guard: Guard) -> str:
    register = guard.register.value if guard.register else ""
    texts = {
        Test.EQUALS: f"{register} = {guard.amount}",
        Test.BELOW: f"{register} < {guard.amount}",
    }
    return texts.get(guard.test, guard.test.value)


def _action(action: Action) -> str:
    names = (action.timer, action.register, action.outcome, action.ending)
    words = [action.verb.value, *(name.value for name in names if name is not None)]
    if action.amount is not None:
        words.append(f"{action.amount:g}")
    if action.rest is not None:
        first, factor, most = action.rest
        words.append(f"{first:g} s, times {factor:g} each try, at most {most:g} s")
    return " ".join(words) + (f" ({action.reason})" if action.reason else "")


def _wiring(machine: Machine) -> Iterator[str]:
    yield "[blocks]"
    for number, block in enumerate(machine.blocks):
        yield f"  {number:>3} {_label(machine, block)}  [{block.fragment}]{_parameters(machine, block)}"
        yield from (f"        {exit_.value} -> {_where(machine, address)}" for exit_, address in block.exits)
        yield from (f"        branch -> {_where(machine, address)}" for address in block.branches)
    if machine.orders:
        yield "[standing orders, the first that can act does]"
    for order in machine.orders:
        yield f"  {order.name}: when {order.condition.text} -> {_where(machine, order.entry)}"


def _parameters(machine: Machine, block: Block) -> str:
    parts = [
        f"to {machine.places[block.place].name}" if block.place is not None else "",
        say_seconds(block.seconds) if block.seconds is not None else "",
        f"{block.times} times" if block.times is not None else "",
        f"every {say_seconds(block.every)}" if block.every is not None else "",
        f"condition {block.condition.text}" if block.condition is not None else "",
        f"text '{block.text}'" if block.text else "",
        f"count {block.word} by {block.by}" if block.by else "",
    ]
    return "".join(f", {part}" for part in parts if part)


def _label(machine: Machine, block: Block) -> str:
    if block.step is None:
        return block.fragment
    note = machine.steps[block.step]
    return f"line {note.mark.line}: {note.text}"


def _where(machine: Machine, address: Address) -> str:
    return f"{address[0]}.{address[1]} {_label(machine, machine.blocks[address[0]])}"


# --- graphs -------------------------------------------------------------------------------------------------------

Edge = tuple[str, str, str]
"""From node, to node, label."""


def _nodes(machine: Machine) -> Iterator[tuple[int, list[tuple[str, str]]]]:
    """For each block its states as (identifier, name)."""
    for number, block in enumerate(machine.blocks):
        states = machine.fragments[block.fragment].states
        yield number, [(f"b{number}s{local}", state.name) for local, state in enumerate(states)]


def _edges(machine: Machine) -> Iterator[Edge]:
    """Every row as an edge, those with the same ends joined. Rows that hold anywhere are left out of graphs."""
    for number, block in enumerate(machine.blocks):
        exits = dict(block.exits)
        joined: dict[tuple[str, str], list[str]] = {}
        for local, state in enumerate(machine.fragments[block.fragment].states):
            for row in state.rows:
                for target in _targets(block, number, row, exits):
                    guard = "" if row.guard == ALWAYS else f" [{_guard(row.guard)}]"
                    ends = (f"b{number}s{local}", f"b{target[0]}s{target[1]}")
                    joined.setdefault(ends, []).append(row.event.value + guard)
        yield from ((start, end, ", ".join(labels)) for (start, end), labels in joined.items())


def _targets(block: Block, number: int, row: Row, exits: dict[Exit, Address]) -> tuple[Address, ...]:
    """Where a row can lead within the machine; nowhere for those that stay or return."""
    if isinstance(row.target, int):
        return ((number, row.target),)
    if row.target is Exit.BRANCH:
        return block.branches
    return (exits[row.target],) if row.target in exits else ()


def as_dot(machine: Machine) -> str:
    """The machine as a graph in the DOT language, a cluster a block."""
    lines = [f'digraph "{_plain(machine.name)}" {{', "  rankdir=LR;", "  node [shape=box];"]
    for number, nodes in _nodes(machine):
        lines.append(f"  subgraph cluster_{number} {{")
        lines.append(f'    label="{_plain(_label(machine, machine.blocks[number]))}";')
        lines += [f'    {node} [label="{_plain(name)}"];' for node, name in nodes]
        lines.append("  }")
    lines += [f'  {start} -> {end} [label="{_plain(label)}"];' for start, end, label in _edges(machine)]
    return "\n".join([*lines, "}"]) + "\n"


def as_mermaid(machine: Machine) -> str:
    """The machine as a Mermaid state diagram, a composite state a block."""
    lines = ["stateDiagram-v2"]
    for number, nodes in _nodes(machine):
        lines.append(f'  state "{_plain(_label(machine, machine.blocks[number]))}" as b{number} {{')
        lines += [f'    state "{_plain(name)}" as {node}' for node, name in nodes]
        lines.append("  }")
    lines.append(f"  [*] --> b{machine.start[0]}s{machine.start[1]}")
    lines += [f"  {start} --> {end} : {_plain(label)}" for start, end, label in _edges(machine)]
    return "\n".join(lines) + "\n"


def _plain(text: str) -> str:
    """A label that neither language can trip over."""
    return text.replace("\\", "/").replace('"', "'").replace(":", " -").replace(";", ",")


def as_json(machine: Machine) -> str:
    """The machine as a record keeps it; reading it gives the same machine."""
    return to_json(machine) + "\n"


def differences(one: Machine, other: Machine) -> list[str]:
    """The lines in which two machines differ, as a unified diff of their tables; none where they are the same."""
    lines = unified_diff(as_text(one).splitlines(), as_text(other).splitlines(), "recorded", "now", lineterm="", n=1)
    return [] if one == other else list(lines) or ["They differ in what the table does not show."]


FORMATS: dict[str, Callable[[Machine], str]] = {
    "table": as_text,
    "dot": as_dot,
    "mermaid": as_mermaid,
    "json": as_json,
}
"""The forms in which a machine can be printed, by the word for it."""
