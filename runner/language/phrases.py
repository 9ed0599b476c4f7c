"""The small grammar: phrases of retry rules, hours, sizes, facings. Text to values, or `PhraseError`."""

from __future__ import annotations

import math
import re

from runner.language.diagnostics import nearest, quoted
from runner.language.mission import Recovery, RecoveryKind, Rest
from runner.language.quantities import ANGLE, DURATION, LENGTH, Amount, PhraseError, parse_clock

REST = Amount("A rest", DURATION, "1 s", "1 h")
STALL_PROGRESS = Amount("The progress asked for", LENGTH, "5 cm", "10 m")
STALL_WINDOW = Amount("The time for progress", DURATION, "2 s", "10 min")

RECOVERY_AMOUNTS: dict[RecoveryKind, Amount | None] = {
    RecoveryKind.REPLAN: None,
    RecoveryKind.CLEAR: Amount("The radius to clear", LENGTH, "0.2 m", "20 m"),
    RecoveryKind.EASE_BACK: Amount("The way back", LENGTH, "5 cm", "3 m"),
    RecoveryKind.REST: REST,
    RecoveryKind.RELOCATE: None,
}
"""What each recovery is told, if anything."""

_RECOVERY_FORMS = {
    RecoveryKind.REPLAN: "replan",
    RecoveryKind.CLEAR: "clear 3 m",
    RecoveryKind.EASE_BACK: "ease back 0.4 m",
    RecoveryKind.REST: "rest 30 s",
    RecoveryKind.RELOCATE: "relocate",
}

FACING = Amount("A facing", ANGLE, "-360 deg", "360 deg")

FACINGS = {"east": 0.0, "north": math.pi / 2.0, "west": math.pi, "south": 1.5 * math.pi}
"""Headings by name, radians counterclockwise from x."""

_REST_PHRASE = re.compile(r"([^,]*[^,\s])(?:\s*,\s*doubling\s+to\s+(\S.*))?")
_STALL_PHRASE = re.compile(r"under\s+(\S.*?)\s+of\s+progress\s+in\s+(\S.*)")
_RECOVERY_PHRASE = re.compile(r"([a-z]+(?: [a-z]+)?)(?: +([0-9+-.,].*))?")
_SPAN_PHRASE = re.compile(r"(\S+?)\s*-\s*(\S+)")
_SIZE_PHRASE = re.compile(r"(\S.*?)\s+x\s+(\S.*)")


def parse_rest(text: str) -> Rest:
    """`20 s`, or `20 s, doubling to 2 min`."""
    match = _REST_PHRASE.fullmatch(text)
    if match is None:
        help_text = "Write for example 20 s, or 20 s, doubling to 2 min."
        raise PhraseError(0, len(text), "This does not say how long to rest between tries.", help_text)
    first = _part(match, 1, REST)
    if match.group(2) is None:
        return Rest(first)
    most = _part(match, 2, REST)
    if most < first:
        sentence = "The rest cannot double to less than it begins with."
        raise PhraseError(*match.span(2), sentence, f"Write {match.group(1)} or more.")
    return Rest(first, 2.0, most)


def parse_stall(text: str) -> tuple[float, float]:
    """`under 0.3 m of progress in 12 s`: meters and seconds."""
    match = _STALL_PHRASE.fullmatch(text)
    if match is None:
        help_text = "Write for example: under 0.3 m of progress in 12 s"
        raise PhraseError(0, len(text), "This does not say when a leg is stalled.", help_text)
    return _part(match, 1, STALL_PROGRESS), _part(match, 2, STALL_WINDOW)


def parse_recovery(text: str) -> Recovery:
    """`replan`, `clear 3 m`, `ease back 0.4 m`, `rest 30 s` or `relocate`."""
    match = _RECOVERY_PHRASE.fullmatch(text)
    word = match.group(1) if match else text
    kind = next((kind for kind in RecoveryKind if kind.value == word), None)
    if match is None or kind is None:
        raise _unknown_recovery(word)
    amount = RECOVERY_AMOUNTS[kind]
    if amount is None:
        if match.group(2) is not None:
            raise PhraseError(*match.span(2), f"Nothing follows {quoted(word)}.", f"Write {word} alone.")
        return Recovery(kind)
    if match.group(2) is None:
        sentence = f"{quoted(word)} needs {amount.measure.name}."
        raise PhraseError(0, len(text), sentence, f"Write for example {_RECOVERY_FORMS[kind]}.")
    return Recovery(kind, _part(match, 2, amount))


def parse_span(text: str) -> tuple[float, float]:
    """`22:00-06:00`: seconds since midnight, twice. The span may run over midnight."""
    match = _SPAN_PHRASE.fullmatch(text)
    if match is None:
        raise PhraseError(0, len(text), "Hours are two clock times with a dash.", "Write for example 22:00-06:00.")
    start, end = (_clock_part(match, group) for group in (1, 2))
    if start == end:
        sentence = "These hours begin and end at the same time."
        raise PhraseError(0, len(text), sentence, "Write for example 22:00-06:00; for always, 00:00-23:59.")
    return start, end


def parse_size(text: str, side: Amount) -> tuple[float, float]:
    """`60 cm x 40 cm`: x and y, or length and width, in meters."""
    match = _SIZE_PHRASE.fullmatch(text)
    if match is None:
        raise PhraseError(0, len(text), "A size is two lengths with an x between.", "Write for example 60 cm x 40 cm.")
    return _part(match, 1, side), _part(match, 2, side)


def parse_facing(text: str) -> float:
    """`east`, `north`, `west`, `south` or an angle, in radians counterclockwise from x, 0 to under a full turn."""
    if text in FACINGS:
        return FACINGS[text]
    if text[:1].isalpha():
        sentence = "This is no direction."
        raise PhraseError(0, len(text), sentence, "Write east, north, west, south, or an angle such as 90 deg.")
    return FACING.read(text) % (2.0 * math.pi)


def _part(match: re.Match[str], group: int, amount: Amount) -> float:
    """Reads one quantity of a phrase; a fault is placed within the whole phrase."""
    try:
        return amount.read(match.group(group))
    except PhraseError as error:
        raise _shifted(error, match.start(group)) from None


def _clock_part(match: re.Match[str], group: int) -> float:
    try:
        return parse_clock(match.group(group))
    except PhraseError as error:
        raise _shifted(error, match.start(group)) from None


def _shifted(error: PhraseError, offset: int) -> PhraseError:
    return PhraseError(error.start + offset, error.end + offset, error.sentence, error.help)


def _unknown_recovery(word: str) -> PhraseError:
    forms = {kind.value: form for kind, form in _RECOVERY_FORMS.items()}
    sentence = f"There is no recovery called {quoted(word)}."
    return PhraseError(
        0, len(word), sentence, nearest(word, forms, "recovery") + f" Forms: {', '.join(forms.values())}."
    )
