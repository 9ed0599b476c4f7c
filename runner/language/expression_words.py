"""The text of a condition cut into words, each with its place, so that a fault can be shown to the character."""

from __future__ import annotations

import re
from dataclasses import dataclass

from runner.language.diagnostics import quoted
from runner.language.quantities import PhraseError

_WORD = re.compile(r"""\s*(?:([<>=!]+)|([()])|"([^"]*)"|'([^']*)'|([^\s()<>=!"']+)|(\S))""")


@dataclass(frozen=True, slots=True)
class Word:
    """Characters `start` to `end` of the text. In a quoted one, `text` is what stands between the quotes."""

    text: str
    start: int
    end: int
    is_quoted: bool = False

    @property
    def begins_number(self) -> bool:
        """Whether it can only be a value: a number, with or without a unit, or a clock time."""
        return not self.is_quoted and self.text.lstrip("+-.")[:1].isdigit()


def cut(text: str) -> list[Word]:
    """The words of a text, in order; PhraseError for a quote that is never closed."""
    found: list[Word] = []
    stop = len(text.rstrip())
    position = 0
    while position < stop:
        match = _WORD.match(text, position)
        assert match is not None, "any character is a word or a stray"
        group = match.lastindex or 0
        if group == 6:
            raise PhraseError(match.start(6), stop, "This quote is never closed.", "Close it with the same character.")
        quotes = 1 if group in (3, 4) else 0
        found.append(Word(match.group(group), match.start(group) - quotes, match.end(group) + quotes, quotes == 1))
        position = match.end()
    return found


class Words:
    """The words of one text, taken from the front."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.all = cut(text)
        self.at = 0

    def peek(self, ahead: int = 0) -> Word | None:
        """The word that comes next, or the one so many after it; None at the end."""
        return self.all[self.at + ahead] if self.at + ahead < len(self.all) else None

    def is_next(self, *texts: str) -> bool:
        """Whether the next words are these, without quotes."""
        coming = self.all[self.at : self.at + len(texts)]
        return [None if word.is_quoted else word.text for word in coming] == list(texts)

    def take(self, *texts: str) -> bool:
        """Take the next words, if they are these."""
        if self.is_next(*texts):
            self.at += len(texts)
            return True
        return False

    def last_end(self) -> int:
        """The end of the word taken last."""
        return self.all[self.at - 1].end if self.at else 0

    def fault(self, sentence: str, help_text: str) -> PhraseError:
        """A fault at the next word; at the end of the text it is shown at the last one."""
        word = self.peek() or (self.all[-1] if self.all else Word("", 0, len(self.text)))
        return PhraseError(word.start, word.end, sentence, help_text)

    def unexpected(self, help_text: str) -> PhraseError:
        """A fault at the next word, which does not fit here."""
        word = self.peek()
        if word is None:
            return self.fault("This condition is not finished.", help_text)
        return self.fault(f"{quoted(word.text)} does not fit here.", help_text)
