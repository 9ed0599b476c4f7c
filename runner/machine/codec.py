"""Machine <-> JSON, so that a record can hold the machine it ran. What is decoded equals what was encoded."""

from __future__ import annotations

import msgspec

from runner.machine.table import Machine


def to_json(machine: Machine) -> str:
    """The machine as JSON, in the order of its fields: the same machine gives the same text."""
    return msgspec.json.encode(machine).decode()


def from_json(text: str) -> Machine:
    """The machine of that text. msgspec.ValidationError where it is not one."""
    return msgspec.json.decode(text, type=Machine)
