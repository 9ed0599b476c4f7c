"""What a machine relies on without its author having said so: abilities of the robot."""

from __future__ import annotations

from collections.abc import Iterator

from runner.machine.table import Action, Machine, Verb

_ABILITIES = (Verb.CLEAR, Verb.REPLAN, Verb.EASE_BACK, Verb.RELOCATE, Verb.CHARGE)
"""Verbs that not every robot can follow; their words are also those of the backend's capabilities."""

RELATIVE = "relative moves"
"""The word for driving to a pose seen from where the robot stands."""


def abilities_needed(machine: Machine) -> frozenset[str]:
    """The words of what the robot must be able to do beyond driving to a pose and halting."""
    asked = {action.verb.value for action in _actions(machine) if action.verb in _ABILITIES}
    return frozenset(asked | ({RELATIVE} if any(block.relative for block in machine.blocks) else set()))


def _actions(machine: Machine) -> Iterator[Action]:
    for fragment in machine.fragments.values():
        for state in fragment.states:
            yield from state.on_entry
            for row in state.rows:
                yield from row.actions
