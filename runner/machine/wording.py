"""Durations and clock times in words, as an author would write them."""

from __future__ import annotations

from math import isinf


def say_seconds(seconds: float) -> str:
    """`90 s`, `4 min`, `1.5 h`: the largest unit that keeps the number short and exact."""
    for size, unit in ((3600.0, "h"), (60.0, "min")):
        count = seconds / size
        if count >= 1.0 and abs(count * 4.0 - round(count * 4.0)) < 1e-9:
            return f"{count:g} {unit}"
    return f"{seconds:g} s"


def say_clock(seconds: float) -> str:
    """Seconds since midnight as `05:30`, or `05:30:15` where there are seconds."""
    whole = int(seconds) % 86_400
    hours, minutes, rest = whole // 3600, whole // 60 % 60, whole % 60
    return f"{hours:02d}:{minutes:02d}" + (f":{rest:02d}" if rest else "")


def say_roughly(seconds: float) -> str:
    """A duration to read at a glance: `45 s`, `12 min`, `3 h 20 min`; `no bound` for an infinite one."""
    if isinf(seconds):
        return "no bound"
    if seconds < 99.5:
        return f"{seconds:.0f} s"
    minutes = round(seconds / 60.0)
    if minutes < 100:
        return f"{minutes} min"
    return f"{minutes // 60} h {minutes % 60:02d} min"
