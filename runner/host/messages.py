"""What screens and commands say to the process that owns a run, and what it answers: JSON, one message a frame.

Version 1. Every message carries `v`. Unknown fields are refused, texts are bounded, so that what is taken is what was
meant. Commands carry an id: the same id again is the same command, and gets the same answer.
"""

from __future__ import annotations

from enum import Enum
from typing import Annotated

import msgspec
from msgspec import Meta

from runner.host.view import FeedLine, View

VERSION = 1
BYTES_MOST = 65_536
"""No message to a run may be longer."""

Name = Annotated[str, Meta(min_length=1, max_length=120)]
Text = Annotated[str, Meta(max_length=2_000)]


class Deed(Enum):
    """What a person can do to a run."""

    HOLD = "hold"
    RELEASE = "release"
    SKIP = "skip"
    ANSWER = "answer"
    ABORT = "abort"
    SAY = "say"


class Look(msgspec.Struct, frozen=True, tag_field="ask", tag="look", forbid_unknown_fields=True):
    """A watcher wants the latest view, and the lines of the feed after the one numbered `after`."""

    v: int
    watcher: Name
    who: Name
    after: Annotated[int, Meta(ge=0)] = 0


class Do(msgspec.Struct, frozen=True, tag_field="ask", tag="do", forbid_unknown_fields=True):
    """A person acts. `text` is the answer, or what is said."""

    v: int
    id: Name
    who: Name
    deed: Deed
    text: Text = ""


class Leave(msgspec.Struct, frozen=True, tag_field="ask", tag="leave", forbid_unknown_fields=True):
    """A watcher goes away."""

    v: int
    watcher: Name


Ask = Look | Do | Leave


class News(msgspec.Struct, frozen=True, tag_field="told", tag="news"):
    """The answer to a look. `age` is how many seconds ago the run last gave a sign of life."""

    v: int
    view: View | None
    lines: list[FeedLine]
    last: int
    age: float
    watchers: int


class Done(msgspec.Struct, frozen=True, tag_field="told", tag="done"):
    """The answer to a deed, once the engine has had it. `accepted` is False where it had no effect."""

    v: int
    id: str
    accepted: bool
    text: str


class Fault(msgspec.Struct, frozen=True, tag_field="told", tag="fault"):
    """The answer to what cannot be understood."""

    v: int
    text: str


Told = News | Done | Fault

encode = msgspec.json.Encoder().encode
_ASK = msgspec.json.Decoder(Ask)
_TOLD = msgspec.json.Decoder(Told)


class _Version(msgspec.Struct):
    v: int


_VERSION = msgspec.json.Decoder(_Version)


def decode_ask(data: bytes) -> Ask:
    """The question in a frame. ValueError, with a sentence, where it is none."""
    _check_version(data)
    return _ASK.decode(data)


def decode_told(data: bytes) -> Told:
    """The answer in a frame. ValueError where it is none."""
    _check_version(data)
    return _TOLD.decode(data)


def _check_version(data: bytes) -> None:
    version = _VERSION.decode(data).v
    if version != VERSION:
        raise ValueError(
            f"This is version {VERSION} of the messages to a run; the other side speaks version {version}."
        )
