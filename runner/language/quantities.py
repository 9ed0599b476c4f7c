"""Quantities with units, and clock times: text to numbers in meters, seconds and radians.

A number without its unit is an error that shows how to write it. Every kind of value a file may hold has a range of
what is physically sensible, so that `speed: 80 m/s` is found before a wheel turns. Nothing here knows about files:
a `PhraseError` says which characters of the text are wrong, and the caller knows where the text stands.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field

from runner.language.diagnostics import quoted, shown


class PhraseError(ValueError):
    """A text that cannot be read: characters `start` to `end` of it are wrong, and why, and what to write."""

    def __init__(self, start: int, end: int, sentence: str, help_text: str) -> None:
        super().__init__(sentence)
        self.start = start
        self.end = end
        self.sentence = sentence
        self.help = help_text


@dataclass(frozen=True, slots=True)
class Measure:
    """What is measured, with its article, and its units as factors to the unit used inside."""

    name: str
    units: dict[str, float]


LENGTH = Measure("a length", {"m": 1.0, "cm": 0.01, "mm": 0.001})
DURATION = Measure("a time", {"s": 1.0, "min": 60.0, "h": 3600.0})
SPEED = Measure("a speed", {"m/s": 1.0, "cm/s": 0.01, "km/h": 1.0 / 3.6})
ACCELERATION = Measure("an acceleration", {"m/s2": 1.0})
ANGLE = Measure("an angle", {"deg": math.pi / 180.0})
TURN_SPEED = Measure("a turning speed", {"deg/s": math.pi / 180.0})
TURN_ACCELERATION = Measure("a turning acceleration", {"deg/s2": math.pi / 180.0})
SHARE = Measure("a share", {"%": 0.01})
ENERGY = Measure("an energy", {"Wh": 1.0, "kWh": 1000.0})
POWER = Measure("a power", {"W": 1.0, "kW": 1000.0})
RATE = Measure("a rate", {"Hz": 1.0})
FREQUENCY = Measure("a number an hour", {"/h": 1.0, "/d": 1.0 / 24.0})
"""How often something happens, per hour."""

_MISSPELLED = {
    "sec": "s", "secs": "s", "second": "s", "seconds": "s", "mins": "min", "minute": "min", "minutes": "min",
    "hr": "h", "hrs": "h", "hour": "h", "hours": "h", "meter": "m", "meters": "m", "metre": "m", "metres": "m",
    "percent": "%", "degree": "deg", "degrees": "deg", "°": "deg", "kph": "km/h", "mps": "m/s",
    "m/s^2": "m/s2", "m/s²": "m/s2", "deg/s^2": "deg/s2", "watt": "W", "w": "W", "wh": "Wh", "hz": "Hz",
}  # fmt: skip
"""Spellings people try, with the one that is read."""

_QUANTITY = re.compile(r"([+-]?[0-9]+(?:\.[0-9]+)?) ?((?:[^\s0-9.,][^\s]*)?)")
_NUMBER_MISWRITTEN = re.compile(r"([+-]?)([0-9]*)[.,]([0-9]+) ?(\S*)")
_COUNT = re.compile(r"0|[1-9][0-9]{0,8}")
_CLOCK = re.compile(r"([0-9]{1,2}):([0-9]{2})")


@dataclass(frozen=True, slots=True)
class Amount:
    """A value that a key may have: what it is called, how it is measured, and the sensible range, both ends in it."""

    name: str
    measure: Measure
    least_text: str
    most_text: str
    least: float = field(init=False)
    most: float = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "least", parse_quantity(self.least_text, self.measure))
        object.__setattr__(self, "most", parse_quantity(self.most_text, self.measure))

    def read(self, text: str) -> float:
        """The value in the unit used inside; PhraseError if it is none or out of range."""
        value = parse_quantity(text, self.measure)
        if self.least <= value <= self.most:
            return value
        raise PhraseError(
            0,
            len(text),
            f"{self.name} cannot be {shown(text)}.",
            f"Write something from {self.least_text} to {self.most_text}.",
        )


@dataclass(frozen=True, slots=True)
class Count:
    """A whole number that a key may have, with its range."""

    name: str
    least: int
    most: int

    def read(self, text: str) -> int:
        """The number; PhraseError if it is none or out of range."""
        if not _COUNT.fullmatch(text):
            raise PhraseError(
                0,
                len(text),
                f"{self.name} is a whole number, written in digits.",
                f"Write for example {self.least + 2}.",
            )
        value = int(text)
        if self.least <= value <= self.most:
            return value
        raise PhraseError(0, len(text), f"{self.name} cannot be {shown(text)}.", f"Write {self.least} to {self.most}.")


def parse_quantity(text: str, measure: Measure) -> float:
    """A number with a unit of that measure, in the unit used inside; PhraseError for anything else."""
    match = _QUANTITY.fullmatch(text)
    if match is None:
        raise _not_a_quantity(text, measure)
    number, unit = match.groups()
    factor = measure.units.get(unit)
    if factor is not None:
        return _scaled(float(number), factor)
    if not unit:
        raise PhraseError(
            0, len(text), f"{measure.name.capitalize()} needs a unit.", f"Write {_choices(number, measure)}."
        )
    raise _wrong_unit(number, unit, match.start(2), len(text), measure)


def format_quantity(value: float, measure: Measure) -> str:
    """A value in the largest unit that leaves a whole number, else in the first; reads back as the same value."""
    for unit, factor in sorted(measure.units.items(), key=lambda pair: -pair[1]):
        count = round(value / factor)
        if abs(count) >= 1 and _scaled(count, factor) == value:
            return f"{count} {unit}"
    unit, factor = next(iter(measure.units.items()))
    return f"{value / factor:.17g} {unit}"


def _scaled(number: float, factor: float) -> float:
    """A number times its unit. Hundredths and thousandths are divided, so that 70 % is 0.7 and not a little more."""
    parts = 1.0 / factor
    return number / parts if parts.is_integer() else number * factor


def parse_clock(text: str) -> float:
    """A time of day, `06:00`, in seconds since midnight; PhraseError for anything else."""
    match = _CLOCK.fullmatch(text)
    if match is None:
        raise PhraseError(0, len(text), "A clock time has hours and minutes.", "Write for example 06:00.")
    hours, minutes = int(match.group(1)), int(match.group(2))
    if hours > 23 or minutes > 59:
        raise PhraseError(0, len(text), f"There is no clock time {text}.", "Write 00:00 to 23:59.")
    return hours * 3600.0 + minutes * 60.0


def parse_number(text: str) -> float | None:
    """A bare number, as coordinates may be, or None."""
    match = _QUANTITY.fullmatch(text)
    return float(match.group(1)) if match and not match.group(2) else None


def _choices(number: str, measure: Measure) -> str:
    written = [f"{number} {unit}" for unit in measure.units]
    return written[0] if len(written) == 1 else f"{', '.join(written[:-1])} or {written[-1]}"


def _not_a_quantity(text: str, measure: Measure) -> PhraseError:
    miswritten = _NUMBER_MISWRITTEN.fullmatch(text)
    if miswritten:
        sign, whole, fraction, unit = miswritten.groups()
        number = f"{sign}{whole or '0'}.{fraction}"
        right = f"{number} {unit}" if unit in measure.units else f"{number} {next(iter(measure.units))}"
        return PhraseError(0, len(text), "A decimal is written with a point between digits.", f"Write {right}.")
    sentence = f"This is not {measure.name}: a number and a unit are meant."
    return PhraseError(0, len(text), sentence, f"Write for example {_choices('5', measure)}.")


def _wrong_unit(number: str, unit: str, start: int, end: int, measure: Measure) -> PhraseError:
    right = _MISSPELLED.get(unit, _MISSPELLED.get(unit.lower(), unit.lower()))
    if right in measure.units:
        return PhraseError(start, end, f"There is no unit {quoted(unit)}.", f"Write {number} {right}.")
    bare = measure.name.split(" ", 1)[1]
    return PhraseError(start, end, f"{quoted(unit)} is not a unit of {bare}.", f"Write {_choices(number, measure)}.")
