"""Conditions from text: a small typed language, parsed by hand so that each fault has its column and its help.

    condition  = either [ "for" TIME ]
    either     = both { "or" both }
    both       = single { "and" single }
    single     = "not" single | "(" either ")" | "proven" | "last leg" OUTCOME | "answer is" ANSWER | comparison
    comparison = ( "battery" | "clock" | "elapsed" | "laps" | COUNT ) ( "<" | "<=" | ">" | ">=" | "=" ) VALUE

What a condition may name depends on the mission around it; `Parsed.uses` says what it did name and where, for the
reader of missions to check.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from enum import Enum

from runner.language.diagnostics import nearest, nearest_word, quoted, shown
from runner.language.expression_words import Word, Words
from runner.language.expressions import Condition, Expression, Kind, Operator, Quantity
from runner.language.quantities import DURATION, SHARE, Amount, Count, PhraseError, parse_clock

BATTERY = Amount("The charge of a battery", SHARE, "0 %", "100 %")
ELAPSED = Amount("The time since the beginning", DURATION, "1 s", "168 h")
LASTING = Amount("The time a condition is to last", DURATION, "1 s", "24 h")
LAPS = Count("The number of laps", 0, 100_000)
COUNTED = Count("A count", 0, 1_000_000)

OUTCOMES = ("arrived", "failed", "skipped")
RESERVED = ("and", "or", "not", "for", "is", "proven", "answer", "last", *(quantity.value for quantity in Quantity))
"""Words that no count can be called."""

_CLOCK = re.compile(r"[0-9]{1,2}:[0-9]{2}")
_BARE_NUMBER = re.compile(r"[+-]?[0-9]+(?:[.,][0-9]+)?")
_JOINS = ("and", "or", "for")
_EXAMPLE = "Write for example battery < 20 %."
_MISWRITTEN = {"==": "=", "=<": "<=", "=>": ">=", "!=": "not (... = ...)", "<>": "not (... = ...)"}


class Named(Enum):
    """What a condition names that the mission around it must have."""

    COUNT = "count"
    ANSWER = "answer"
    LAPS = "laps"
    PROVEN = "proven"


@dataclass(frozen=True, slots=True)
class Use:
    """A name in a condition: characters `start` to `end` of its text."""

    what: Named
    name: str
    start: int
    end: int


@dataclass(frozen=True, slots=True)
class Parsed:
    """A condition, what it names, and where it says how long it must last, if it does."""

    condition: Condition
    uses: tuple[Use, ...]
    lasting: tuple[int, int] | None = None


def parse_condition(text: str) -> Parsed:
    """The condition a text holds; PhraseError for anything else."""
    parser = _Parser(Words(text))
    expression = parser.either()
    begins = parser.words.peek()
    lasting = parser.lasting() if parser.words.take("for") else 0.0
    if parser.words.peek() is not None:
        raise parser.words.unexpected("Join conditions with and, or; write for 10 s at the end.")
    span = None if begins is None else (begins.start, parser.words.last_end())
    return Parsed(Condition(expression, lasting, text), tuple(parser.uses), span)


def parse_until(text: str) -> Parsed:
    """The same, where a clock time alone means that the clock has reached it."""
    first = text.split(maxsplit=1)[0] if text.strip() else ""
    means_clock = first[:1].isdigit() and not set(text) & set("<>=")
    if not _CLOCK.fullmatch(text) and (not means_clock or _CLOCK.fullmatch(first)):
        return parse_condition(text)
    expression = Expression(Kind.COMPARE, quantity=Quantity.CLOCK, operator=Operator.AT_LEAST, value=parse_clock(text))
    return Parsed(Condition(expression, text=text), ())


class _Parser:
    """Recursive descent; the length of a phrase bounds its depth."""

    def __init__(self, words: Words) -> None:
        self.words = words
        self.uses: list[Use] = []

    def either(self) -> Expression:
        return self._joined("or", Kind.OR, self._both)

    def _both(self) -> Expression:
        return self._joined("and", Kind.AND, self._single)

    def _joined(self, word: str, kind: Kind, read: Callable[[], Expression]) -> Expression:
        parts = [read()]
        while self.words.take(word):
            parts.append(read())
        return parts[0] if len(parts) == 1 else Expression(kind, tuple(parts))

    def _single(self) -> Expression:
        words = self.words
        start = words.peek()
        if start is None:
            raise words.unexpected(_EXAMPLE)
        if words.take("not"):
            return Expression(Kind.NOT, (self._single(),))
        if words.take("("):
            return self._in_parentheses(start)
        if words.take("proven"):
            self._use(Named.PROVEN, "proven", start)
            return Expression(Kind.PROVEN)
        if words.is_next("last"):
            return self._last_leg()
        if words.is_next("answer"):
            return self._answer()
        return self._comparison(start)

    def _in_parentheses(self, opening: Word) -> Expression:
        inside = self.either()
        if not self.words.take(")"):
            if self.words.peek() is None:
                raise PhraseError(opening.start, opening.end, "This parenthesis is never closed.", "Close it with ).")
            raise self.words.unexpected("Join conditions with and, or; close the parenthesis with ).")
        return inside

    def _last_leg(self) -> Expression:
        if not self.words.take("last", "leg"):
            raise self.words.fault('"last" goes with "leg".', "Write for example last leg failed.")
        word = self.words.peek()
        if word is None or word.text not in OUTCOMES:
            help_text = f"Write {', '.join(f'last leg {one}' for one in OUTCOMES[:-1])} or last leg {OUTCOMES[-1]}."
            if word is None:
                raise self.words.unexpected(help_text)
            raise self.words.fault(f"No leg ends as {quoted(word.text)}.", help_text)
        self.words.at += 1
        return Expression(Kind.LAST_LEG, word=word.text)

    def _answer(self) -> Expression:
        if not self.words.take("answer", "is"):
            raise self.words.fault('"answer" goes with "is".', "Write for example answer is yes.")
        name, start, end = self._name(_JOINS, "an answer", "answer is yes")
        self.uses.append(Use(Named.ANSWER, name, start, end))
        return Expression(Kind.ANSWER, word=name)

    def _name(self, stops: tuple[str, ...], what: str, example: str) -> tuple[str, int, int]:
        """Words up to one of `stops`, an operator or a parenthesis; or one text in quotes."""
        first = self.words.peek()
        taken: list[Word] = []
        while (word := self.words.peek()) is not None and not _ends_name(word, stops):
            taken.append(word)
            self.words.at += 1
            if word.is_quoted:
                break
        if not taken or first is None:
            raise self.words.unexpected(f"Write {what}, for example {example}.")
        return " ".join(word.text for word in taken), first.start, taken[-1].end

    def _comparison(self, first: Word) -> Expression:
        if first.begins_number:
            raise _value_first(first)
        name, start, end = self._name((*_JOINS, "is"), "what is compared", "battery < 20 %")
        quantity = _QUANTITIES.get(name, Quantity.COUNT)
        operator = self._operator(name, quantity, (start, end))
        value = self._value(quantity, operator, name, (start, end))
        word = name if quantity is Quantity.COUNT else ""
        return Expression(Kind.COMPARE, quantity=quantity, operator=operator, value=value, word=word)

    def _operator(self, name: str, quantity: Quantity, span: tuple[int, int]) -> Operator:
        word = self.words.peek()
        if word is None or word.is_quoted or not set(word.text) <= set("<>=!"):
            raise self._no_operator(name, quantity, span)
        operator = _OPERATORS.get(word.text)
        allowed = _ALLOWED.get(quantity, tuple(Operator))
        if operator is None:
            help_text = f"Write {_MISWRITTEN.get(word.text, '<, <=, >, >= or =')}."
            raise self.words.fault(f"There is no comparison {quoted(word.text)}.", help_text)
        if operator not in allowed:
            signs = [one.value for one in allowed]
            help_text = f"Compare it with {', '.join(signs[:-1])} or {signs[-1]}."
            raise self.words.fault(_REFUSED[quantity], help_text)
        self.words.at += 1
        return operator

    def _no_operator(self, name: str, quantity: Quantity, span: tuple[int, int]) -> PhraseError:
        if quantity is not Quantity.COUNT:
            example = _EXAMPLES[quantity]
            return PhraseError(*span, f"{quoted(name)} alone is not a condition.", f"Write for example {example}.")
        sentence = f"{quoted(name)} is not a condition."
        return PhraseError(*span, sentence, f"{nearest(name, _BEGINNINGS, 'word')} {_EXAMPLE}".strip())

    def _value(self, quantity: Quantity, operator: Operator, name: str, span: tuple[int, int]) -> float:
        word = self.words.peek()
        if word is None or word.text in ("(", ")", *_JOINS):
            example = _EXAMPLES.get(quantity, f"{shown(name)} >= 5")
            raise self.words.unexpected(f"Write what it is compared with, for example {example}.")
        if quantity is Quantity.COUNT:
            return self._count_value(name, span)
        if quantity is Quantity.LAPS:
            self.uses.append(Use(Named.LAPS, name, *span))
        text, start, end = self._value_text()
        try:
            return _READ[quantity](text)
        except PhraseError as error:
            help_text = error.help
            if quantity is Quantity.BATTERY and _BARE_NUMBER.fullmatch(text):
                help_text = f"Write battery {operator.value} {text.replace(',', '.')} %."
            raise PhraseError(start + error.start, start + error.end, error.sentence, help_text) from None
        finally:
            assert end <= len(self.words.text)

    def _count_value(self, name: str, span: tuple[int, int]) -> float:
        text, start, end = self._value_text()
        try:
            value = COUNTED.read(text)
        except PhraseError as error:
            if nearest_word(name, _QUANTITIES) is None:
                raise PhraseError(start, end, error.sentence, f"Write for example {shown(name)} >= 5.") from None
            raise PhraseError(
                *span, f"There is no {quoted(name)} to compare.", nearest(name, _QUANTITIES, "word")
            ) from None
        self.uses.append(Use(Named.COUNT, name, *span))
        return value

    def _value_text(self) -> tuple[str, int, int]:
        """A number with its unit, which may be a word of its own, as it is written."""
        word = self.words.peek()
        assert word is not None, "the caller has looked"
        self.words.at += 1
        unit = self.words.peek()
        if unit is None or not _BARE_NUMBER.fullmatch(word.text) or _ends_name(unit, _JOINS):
            return word.text, word.start, word.end
        self.words.at += 1
        return self.words.text[word.start : unit.end], word.start, unit.end

    def lasting(self) -> float:
        if self.words.peek() is None:
            raise self.words.unexpected("Write how long, for example for 10 s.")
        text, start, _ = self._value_text()
        try:
            return LASTING.read(text)
        except PhraseError as error:
            raise PhraseError(start + error.start, start + error.end, error.sentence, error.help) from None

    def _use(self, what: Named, name: str, word: Word) -> None:
        self.uses.append(Use(what, name, word.start, word.end))


def _ends_name(word: Word, stops: tuple[str, ...]) -> bool:
    return not word.is_quoted and (word.text in stops or word.text[0] in "<>=!()")


def _value_first(word: Word) -> PhraseError:
    if _CLOCK.fullmatch(word.text):
        return PhraseError(
            word.start, word.end, "A clock time alone is not a condition here.", f"Write clock >= {word.text}."
        )
    return PhraseError(word.start, word.end, "A comparison begins with what is compared.", _EXAMPLE)


_QUANTITIES = {quantity.value: quantity for quantity in Quantity if quantity is not Quantity.COUNT}
_OPERATORS = {operator.value: operator for operator in Operator}
_BEGINNINGS = (*_QUANTITIES, "proven", "last leg", "answer is", "not")
_ALLOWED = {
    Quantity.CLOCK: (Operator.BELOW, Operator.AT_LEAST),
    Quantity.BATTERY: (Operator.BELOW, Operator.AT_MOST, Operator.ABOVE, Operator.AT_LEAST),
    Quantity.ELAPSED: (Operator.BELOW, Operator.AT_MOST, Operator.ABOVE, Operator.AT_LEAST),
}
_REFUSED = {
    Quantity.CLOCK: "The clock is before a time or has reached it; there is no other comparison.",
    Quantity.BATTERY: "A battery is hardly ever at exactly one charge.",
    Quantity.ELAPSED: "The time since the beginning is hardly ever exactly this.",
}
_EXAMPLES = {
    Quantity.BATTERY: "battery < 20 %",
    Quantity.CLOCK: "clock >= 05:30",
    Quantity.ELAPSED: "elapsed > 2 h",
    Quantity.LAPS: "laps >= 3",
}
_READ: dict[Quantity, Callable[[str], float]] = {
    Quantity.BATTERY: BATTERY.read,
    Quantity.CLOCK: parse_clock,
    Quantity.ELAPSED: ELAPSED.read,
    Quantity.LAPS: LAPS.read,
}
