"""One controlling lease at a time: who has it, whether they are alive, and when it is over.

A pure state machine of the robot's side. Signs of life count only while they are fresh: a beat tells which stamp of
the robot its sender has heard, and one that was stuck in a line for longer than the agreed silence says nothing about
now. No clocks need to agree for that, because the robot compares only its own stamps.
"""

from __future__ import annotations

from collections import OrderedDict
from dataclasses import dataclass, field

from backends.link.messages import Done, Take

ANSWERS_KEPT = 64
"""Answers to commands that are kept to be repeated; a controller has at most two commands under way."""
REQUESTS_KEPT = 64
"""Requests for the lease that are recognized when they come again."""


@dataclass(slots=True)
class Lease:
    """A lease in force. `person` is the key its holder was admitted with, empty on a plain line."""

    token: str
    session: str
    person: str
    every: float
    window: int
    peer: bytes
    fresh: float
    """The newest stamp of the robot that the holder is known to have heard: it was alive after that."""
    seen: int = 0
    highest: int = 0
    """The highest number of a command that was served."""
    answers: OrderedDict[int, Done] = field(default_factory=OrderedDict)

    def answer(self, number: int) -> Done | None:
        """What a repeated command is answered; None for one that is to be served now."""
        if number > self.highest:
            return None
        return self.answers.get(number) or Done(number, "overtaken", "A later command was served first.")

    def keep(self, answer: Done) -> None:
        """Remember the answer to a command that was served."""
        self.answers[answer.number] = answer
        self.highest = max(self.highest, answer.number)
        while len(self.answers) > ANSWERS_KEPT:
            self.answers.popitem(last=False)


class LeaseDesk:
    """Hands the lease out and takes it back."""

    def __init__(self, silence: float, term: float) -> None:
        self.silence = silence
        self.term = term
        self.lease: Lease | None = None
        self._requests: OrderedDict[tuple[str, str], str] = OrderedDict()

    def take(self, request: Take, peer: bytes, person: str, token: str, now: float) -> str | None:
        """The token for a request, None while another holds the lease. A request that comes again changes nothing.

        The same session, with the same key, takes its lease over: its program was started again. The token before
        is dead from then on.
        """
        asked = (person, request.nonce)
        if asked in self._requests:
            return self._requests[asked]
        held = self.lease
        if held is not None and (held.session, held.person) != (request.session, person):
            return None
        self.lease = Lease(token, request.session, person, request.every, request.window, peer, now)
        self._requests[asked] = token
        while len(self._requests) > REQUESTS_KEPT:
            self._requests.popitem(last=False)
        return token

    def holder(self, token: str, peer: bytes, person: str) -> Lease | None:
        """The lease of that token, if it is in force and was given to that key; answers go to `peer` from now on."""
        lease = self.lease
        if lease is None or lease.token != token or lease.person != person:
            return None
        lease.peer = peer
        return lease

    def alive(self, lease: Lease, heard: float, now: float) -> bool:
        """Note a sign of life from who has heard that stamp. False where it is too old, or a stamp of the future."""
        if not now - self.silence <= heard <= now:
            return False
        lease.fresh = max(lease.fresh, heard)
        return True

    def silent(self, now: float) -> bool:
        """Whether the holder has given no fresh sign of life for the agreed time."""
        return self.lease is not None and now - self.lease.fresh > self.silence

    def over(self, now: float) -> bool:
        """Whether the holder has been silent for so long that the lease is over."""
        return self.lease is not None and now - self.lease.fresh > self.term

    def end(self) -> None:
        """Take the lease back."""
        self.lease = None
