"""Numbers and states of a view put into short words, the same on every screen and in plain lines."""

from __future__ import annotations

from runner.host.view import Health, View

BROKEN_OFF = "broken off"
"""The outcome of a run whose process died, in the record's words: it can be picked up."""

OLD_AFTER_S = 3.0
"""News older than this are called old. A run gives a sign of life some times a second."""
OLD_AT_FIRST_S = 15.0
"""The same before the first view: the first run after an installation compiles."""

_ALL_ANSWERED = 0.995
"""From this share on, no beat in a hundred is missing."""

_NEXT_FOR_YOU: dict[Health, str] = {
    Health.STARTING: "nothing for you to do",
    Health.MOVING: "nothing for you to do",
    Health.WAITING: "nothing for you to do",
    Health.RECOVERING: "it is helping itself",
    Health.HELD: "your turn: r releases",
    Health.NEEDS_YOU: "your turn: r goes on, a aborts",
    Health.ENDED: "",
}


def advice_for(view: View) -> str:
    """The answer to the question whether a person has to act."""
    if view.health is Health.NEEDS_YOU and view.question is not None:
        return "your turn: Enter answers"
    return _NEXT_FOR_YOU[view.health]


def is_lost(view: View | None, age: float) -> bool:
    """Whether the news are too old to be taken for what is so now."""
    if view is None:
        return age >= OLD_AT_FIRST_S
    return view.outcome is None and age >= (OLD_AT_FIRST_S if view.health is Health.STARTING else OLD_AFTER_S)


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


def ends_about(view: View) -> str:
    """When the run is over, as far as that is known; empty where nothing is known of it."""
    if view.outcome is not None:
        return ""
    until, by = view.repeats_until, view.ends_by
    if until is not None and (by is None or until < by):
        return f"repeats until about {_clock_at(view, until)}"
    return f"ends by {_clock_at(view, by)}" if by is not None else ""


def line_so_far(view: View) -> tuple[str, str, str]:
    """The line to the robot: how quick, how much of it is lost, and how far apart the clocks are; empty where nothing
    is to be said."""
    line = view.line
    if line is None or view.outcome is not None:
        return "", "", ""
    if line.round_trip is None or line.round_trip_worst is None:
        quick = "line: no answer yet"
    else:
        quick = f"line {amount(line.round_trip * 1e3, 'ms')}, at worst {amount(line.round_trip_worst * 1e3, 'ms')}"
    lost = f"{100.0 * (1.0 - line.answered):.0f} % of beats lost" if line.answered < _ALL_ANSWERED else ""
    apart = f"clocks {line.offset:+.3f} s apart" if line.offset_error is not None else ""
    return quick, lost, apart


def laps(view: View) -> str:
    """The laps of the loops around the step, outermost first: `lap 2 of 8`."""
    most = (*view.laps_at_most, *([None] * len(view.laps)))
    told = [f"{lap} of {at_most}" if at_most else str(lap) for lap, at_most in zip(view.laps, most, strict=False)]
    return f"lap {', '.join(told)}" if told else ""


def _clock_at(view: View, stamp: float) -> str:
    """The time of day at a stamp, as HH:MM."""
    at = round((seconds_of(view.clock) + stamp - view.stamp) / 60) % 1440
    return f"{at // 60:02}:{at % 60:02}"


def seconds_of(clock: str) -> float:
    """Seconds since midnight of HH:MM:SS."""
    hours, minutes, seconds = (int(part) for part in clock.split(":"))
    return hours * 3600.0 + minutes * 60.0 + seconds
