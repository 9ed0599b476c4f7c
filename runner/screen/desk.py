"""What the person at this screen has asked for, and how far it has come: sent, without an answer, taken, or refused."""

from __future__ import annotations

from dataclasses import dataclass

from runner.host.messages import Deed, Done
from runner.screen.words import spell_seconds

SHOWN_S = 6.0
"""How long the answer to a key stays."""
SLOW_S = 1.5
"""After so long without an answer it is said that there is none."""

_TAKEN: dict[Deed, str] = {
    Deed.HOLD: "taken; the robot was told to halt",
    Deed.RELEASE: "taken; the mission goes on",
    Deed.SKIP: "taken",
    Deed.ANSWER: "taken",
    Deed.ABORT: "taken; the robot was told to halt",
    Deed.SAY: "noted",
}


@dataclass(frozen=True, slots=True)
class _Asked:
    deed: Deed
    text: str
    at: float
    answer: Done | None = None


class Desk:
    """The newest deed and its fate; an abort is never put aside for a lesser one."""

    def __init__(self) -> None:
        self._id = ""
        self._newest: _Asked | None = None
        self._said, self._said_until = "", 0.0

    @property
    def aborting(self) -> bool:
        """Whether an abort was sent and has not been refused."""
        newest = self._newest
        return newest is not None and newest.deed is Deed.ABORT and (newest.answer is None or newest.answer.accepted)

    def sent(self, deed_id: str, deed: Deed, text: str, now: float) -> None:
        """A deed is on its way."""
        if not self.aborting or deed is Deed.ABORT:
            self._id, self._newest = deed_id, _Asked(deed, text, now)

    def answered(self, done: Done, now: float) -> None:
        """Something came back."""
        if self._newest is not None and done.id == self._id:
            self._newest = _Asked(self._newest.deed, self._newest.text, now, done)

    def say(self, remark: str, now: float) -> None:
        """A word to the person that is about this screen alone."""
        self._said, self._said_until = remark, now + SHOWN_S / 2

    def remark(self, now: float) -> str:
        """What there is to say about it now; empty if nothing."""
        if now < self._said_until:
            return self._said
        asked = self._newest
        if asked is None or (asked.answer is not None and now - asked.at > SHOWN_S):
            return ""
        name = f"{asked.deed.value} {asked.text}".strip()
        if asked.answer is not None:
            return f"{name}: {_TAKEN[asked.deed] if asked.answer.accepted else asked.answer.text}"
        waited = now - asked.at
        slow = f", no answer for {spell_seconds(waited)}, asking again" if waited >= SLOW_S else ""
        return f"{name}: sent{slow}"
