"""What the estimates of a mission take for granted, in sentences that are printed with them."""

from __future__ import annotations

from runner.machine.table import Machine


def assumptions(machine: Machine) -> tuple[str, ...]:
    """What the numbers take for granted, in sentences."""
    said = [
        "Least: every leg arrives by the shortest way, straight on at full speed.",
        "Likely: every leg arrives by the planned way, with doors open.",
        "Most: every leg creeps, then uses all its tries and recoveries up to its time limits; ways planned around "
        "obstacles are at most twice the longest planned one.",
        "Nobody holds, skips or aborts; the battery is full at the start.",
    ]
    if any(block.answers for block in machine.blocks):
        said.append("Likely: a question is answered after half of its time.")
    if any(block.condition is not None and block.fragment == "when" for block in machine.blocks):
        said.append('Likely: each side of a "when" is taken half of the time.')
    if machine.orders:
        names = ", ".join(f'"{order.name}"' for order in machine.orders)
        said.append(f"Standing orders are not counted: {names}. What one takes each time is shown with its steps.")
    return tuple(said)
