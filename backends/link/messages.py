"""The messages of the link, as PROTOCOL.md describes them, and the frames that carry them.

A frame is four bytes of CRC-32, big-endian, and then one JSON object in UTF-8 whose `kind` says which message it is.
Nothing that arrives is trusted: sizes are bounded, fields are strict, numbers are finite and within limits. What does
not pass is a `MessageError`, with a code that PROTOCOL.md lists, and never anything else.

Lengths in meters, times in seconds, angles in radians counterclockwise from +x, poses in the frame of the site.
"""

from __future__ import annotations

from typing import Annotated, Literal, TypeVar
from zlib import crc32

from msgspec import DecodeError, Meta, Struct, ValidationError
from msgspec.json import Decoder, Encoder

VERSION = 1
FRAME_BYTES_MOST = 65_536
"""Longer frames are refused unread; the socket drops the connection they come on."""

Token = Annotated[str, Meta(min_length=32, max_length=32, pattern="^[0-9a-f]*$")]
"""Sixteen random bytes in hexadecimal: a secret, or what makes a request recognizable when it is repeated."""
Session = Annotated[str, Meta(min_length=8, max_length=64, pattern="^[0-9A-Za-z._-]*$")]
Name = Annotated[str, Meta(max_length=100)]
Sentence = Annotated[str, Meta(max_length=300)]
Count = Annotated[int, Meta(ge=0, le=2**53 - 1)]
Stamp = Annotated[float, Meta(ge=0.0, le=1e9)]
Coordinate = Annotated[float, Meta(ge=-1e5, le=1e5)]
Heading = Annotated[float, Meta(ge=-3.15, le=3.15)]
Meters = Annotated[float, Meta(ge=0.0, le=1e9)]
Spot = tuple[Coordinate, Coordinate]
Stand = tuple[Coordinate, Coordinate, Heading]
"""x, y, heading."""

Ability = Literal["clear", "replan", "ease back", "relocate", "charge", "relative moves"]
Progress = Literal["accepted", "under way", "arrived", "refused", "no route", "halted", "failed"]
ENDS: frozenset[str] = frozenset({"arrived", "refused", "no route", "halted", "failed"})
Outcome = Literal["taken", "known", "old", "overtaken", "not able"]
Trouble = Literal["not readable", "not valid", "unknown message", "version", "no lease", "taken", "too old"]


class _Message(Struct, frozen=True, forbid_unknown_fields=True, tag_field="kind"):
    """What all messages share: they are values, and fields that PROTOCOL.md does not list are refused."""


class _Part(Struct, frozen=True, forbid_unknown_fields=True):
    """A piece of a message."""


# --- from the controller to the robot


class Hello(_Message, frozen=True, tag="hello"):
    """Who is there? Needs no lease."""

    versions: Annotated[list[int], Meta(min_length=1, max_length=16)]


class Take(_Message, frozen=True, tag="take"):
    """Ask for the lease. `every` is the least time between two telemetry messages, `window` how many may be unseen."""

    version: int
    session: Session
    nonce: Token
    controller: Name
    every: Annotated[float, Meta(ge=0.01, le=10.0)]
    window: Annotated[int, Meta(ge=1, le=100)]


class Beat(_Message, frozen=True, tag="beat"):
    """A sign of life. `sent` is the controller's clock, `heard` the newest stamp of the robot that came, `seen` the
    highest number of its telemetry that came, or that a state says was sent before it."""

    lease: Token
    sent: Stamp
    heard: Stamp
    seen: Count


class Go(_Message, frozen=True, tag="go"):
    """Drive to a pose. With `relative`, the pose is in the robot's own frame where it stands now, and the
    robot goes there by its odometry alone."""

    lease: Token
    number: Count
    heard: Stamp
    goal: Count
    pose: Stand
    speed: Annotated[float, Meta(gt=0.0, le=10.0)]
    relative: bool = False


class Halt(_Message, frozen=True, tag="halt"):
    """End the goal and every action, and stop."""

    lease: Token
    number: Count


class Clear(_Message, frozen=True, tag="clear"):
    """Forget remembered obstacles within `radius` of the robot."""

    lease: Token
    number: Count
    heard: Stamp
    action: Count
    radius: Annotated[float, Meta(ge=0.0, le=1e3)]


class Replan(_Message, frozen=True, tag="replan"):
    """Throw the route away and plan a new one."""

    lease: Token
    number: Count
    heard: Stamp
    action: Count


class EaseBack(_Message, frozen=True, tag="ease back"):
    """Drive straight backward, slowly, as far as it is free."""

    lease: Token
    number: Count
    heard: Stamp
    action: Count
    distance: Annotated[float, Meta(ge=0.0, le=10.0)]


class Relocate(_Message, frozen=True, tag="relocate"):
    """Find out anew where the robot is, near `pose` if given."""

    lease: Token
    number: Count
    heard: Stamp
    action: Count
    pose: Stand | None


class Charge(_Message, frozen=True, tag="charge"):
    """Begin charging, where the robot stands at a charger."""

    lease: Token
    number: Count
    heard: Stamp


class Leave(_Message, frozen=True, tag="leave"):
    """Give the lease back. The robot ends its goal and stops."""

    lease: Token
    number: Count


Action = Clear | Replan | EaseBack | Relocate
Command = Go | Halt | Clear | Replan | EaseBack | Relocate | Charge | Leave
ToRobot = Hello | Take | Beat | Go | Halt | Clear | Replan | EaseBack | Relocate | Charge | Leave


# --- from the robot to the controller


class Simulated(_Part, frozen=True):
    """How a simulated robot's time runs: `pace` of its seconds a second, from the wall time `begins` at stamp 0."""

    pace: Annotated[float, Meta(ge=0.01, le=1e3)]
    begins: Annotated[str, Meta(max_length=40)]


class About(_Message, frozen=True, tag="about"):
    """The answer to `hello`. `silence` and `term` are when a silent controller is stopped for and dropped."""

    versions: Annotated[list[int], Meta(min_length=1, max_length=16)]
    name: Name
    site: Name
    abilities: Annotated[list[Ability], Meta(max_length=16)]
    silence: Annotated[float, Meta(ge=0.2, le=5.0)]
    term: Annotated[float, Meta(ge=5.0, le=600.0)]
    speed: Annotated[float, Meta(gt=0.0, le=10.0)]
    simulated: Simulated | None = None


class Granted(_Message, frozen=True, tag="granted"):
    """The lease is yours: `lease` is the token of it. `boot` is another one each time the robot's program starts."""

    nonce: Token
    lease: Token
    boot: Token
    stamp: Stamp
    silence: Annotated[float, Meta(ge=0.2, le=5.0)]
    term: Annotated[float, Meta(ge=5.0, le=600.0)]


class Done(_Message, frozen=True, tag="done"):
    """The answer to a command."""

    number: Count
    outcome: Outcome
    reason: Sentence = ""


class GoalState(_Part, frozen=True):
    """Where the newest goal of the session stands, since `stamp`. `pose` is where it leads, in the site frame."""

    id: Count
    status: Progress
    reason: Sentence
    stamp: Stamp
    pose: Stand


class ActionState(_Part, frozen=True):
    """An action that has ended."""

    id: Count
    done: bool
    reason: Sentence
    stamp: Stamp


class State(_Message, frozen=True, tag="state"):
    """All that must not be lost, whole each time. `echo` is the `sent` of the beat it answers, `telemetry` the number
    of the newest telemetry sent before it."""

    number: Count
    stamp: Stamp
    boot: Token
    echo: Stamp | None
    goal: GoalState | None
    suspended: bool
    standing: bool
    telemetry: Count
    actions: Annotated[list[ActionState], Meta(max_length=16)]


class Seen(_Message, frozen=True, tag="telemetry"):
    """What the robot believes and senses. It may be lost, and is never sent late."""

    number: Count
    stamp: Stamp
    pose: Stand
    spread: Meters
    speed: Annotated[float, Meta(ge=-10.0, le=10.0)]
    turn_rate: Annotated[float, Meta(ge=-20.0, le=20.0)]
    battery: Annotated[float, Meta(ge=0.0, le=1.0)]
    driven: Meters
    remaining: Meters | None
    route_number: Count
    route: Annotated[list[Spot], Meta(max_length=256)]
    obstacles: Annotated[list[Spot], Meta(max_length=1000)]


class Fault(_Message, frozen=True, tag="fault"):
    """A message that was not served: why, and the number of the command if it was one that could be read."""

    code: Trouble
    what: Sentence
    number: Count | None = None


FromRobot = About | Granted | Done | State | Seen | Fault


class MessageError(Exception):
    """A frame that is not a message. `code` is one of PROTOCOL.md's; the text says what is wrong and where."""

    def __init__(self, code: Trouble, what: str) -> None:
        super().__init__(what)
        self.code: Trouble = code
        self.what = what[:300]


_M = TypeVar("_M")
_ENCODER = Encoder()
_TO_ROBOT: Decoder[ToRobot] = Decoder(ToRobot)
_FROM_ROBOT: Decoder[FromRobot] = Decoder(FromRobot)


def encode(message: ToRobot | FromRobot) -> bytes:
    """The frame of a message."""
    body = _ENCODER.encode(message)
    return crc32(body).to_bytes(4, "big") + body


def read_by_robot(frame: bytes) -> ToRobot:
    """The message in a frame that a controller sent. MessageError where there is none."""
    return _read(frame, _TO_ROBOT)


def read_by_controller(frame: bytes) -> FromRobot:
    """The message in a frame that a robot sent. MessageError where there is none."""
    return _read(frame, _FROM_ROBOT)


def _read(frame: bytes, decoder: Decoder[_M]) -> _M:
    if not 6 <= len(frame) <= FRAME_BYTES_MOST:
        raise MessageError("not readable", f"A frame has 6 to {FRAME_BYTES_MOST} bytes, this one {len(frame)}.")
    body = frame[4:]
    if crc32(body) != int.from_bytes(frame[:4], "big"):
        raise MessageError("not readable", "The checksum does not fit the text after it.")
    try:
        return decoder.decode(body)
    except ValidationError as error:
        text = str(error)
        code: Trouble = "unknown message" if text.endswith("at `$.kind`") else "not valid"
        raise MessageError(code, text) from None
    except (DecodeError, RecursionError, UnicodeDecodeError) as error:
        raise MessageError("not readable", str(error)) from None
