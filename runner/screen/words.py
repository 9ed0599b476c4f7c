"""Numbers and states of a view put into short words, the same on every screen and in plain lines."""

from __future__ import annotations

from runner.host.view import Health, View

NEXT_FOR_YOU: dict[Health, str] = {
    Health.STARTING: "nothing for you to do",
    Health.MOVING: "nothing for you to do",
    Health.WAITING: "nothing for you to do",
    Health.RECOVERING: "it is helping itself",
    Health.HELD: "your turn: r releases",
    Health.ENDED: "",
}
"""The answer to the question whether a person has to act."""


def spell_seconds(seconds: float) -> str:
    """A duration as M:SS, or H:MM:SS from an hour on."""
    whole = max(int(seconds), 0)
    hours, minutes, rest = whole // 3600, whole // 60 % 60, whole % 60
    return f"{hours}:{minutes:02}:{rest:02}" if hours else f"{minutes}:{rest:02}"


def amount(value: float, unit: str) -> str:
    """A measure with one decimal below ten and none above."""
    return f"{value:.1f} {unit}" if abs(value) < 9.95 else f"{value:.0f} {unit}"


def counted(count: int, one: str, many: str) -> str:
    """`1 leg`, `2 legs`."""
    return f"{count} {one if count == 1 else many}"


def legs_so_far(view: View) -> str:
    """What has been done and what went wrong, so far."""
    legs = counted(view.legs_arrived, "leg arrived", "legs arrived")
    failed = f", {view.legs_failed} failed" if view.legs_failed else ""
    incidents = f", {counted(view.incidents, 'incident', 'incidents')}" if view.incidents else ""
    return f"{legs}{failed}{incidents}"
