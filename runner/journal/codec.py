"""Engine values as text and back: (kind, name, canonical JSON).

The table of classes is read off the unions in `runner.engine.values`, so a new input, command or note is recorded
without a word here. Canonical means: fields in the order of their class, numbers of float fields written as floats in
the shortest form that reads back the same, no white space. Equal values give equal bytes.
"""

from __future__ import annotations

import re
import struct
from collections.abc import Mapping
from itertools import chain
from types import MappingProxyType
from typing import Any, get_args

import msgspec

from runner.engine.values import Command, Input, Note, Seen
from runner.journal.errors import JournalError
from runner.site.values import Point

Value = Input | Command | Note


def plain_name(cls: type) -> str:
    """A class name as a person writes it: LegEnded is "leg ended"."""
    return re.sub(r"(?<!^)(?=[A-Z])", " ", cls.__name__).lower()


def _classes() -> dict[tuple[str, str], type]:
    unions = {"input": Input, "command": Command, "note": Note}
    return {(kind, plain_name(cls)): cls for kind, union in unions.items() for cls in get_args(union)}


CLASSES: Mapping[tuple[str, str], type] = MappingProxyType(_classes())
"""(kind, name) of every class that a record may hold."""

KEYS: Mapping[type, tuple[str, str]] = MappingProxyType({cls: key for key, cls in CLASSES.items()})

_ENCODE = msgspec.json.Encoder().encode

_DECODERS: Mapping[tuple[str, str], msgspec.json.Decoder[Any]] = MappingProxyType(
    {key: msgspec.json.Decoder(cls) for key, cls in CLASSES.items()}
)


def encode(value: Value) -> tuple[str, str, str]:
    """(kind, name, body) of a value.

    The body is read back and written again: an integer in a float field becomes a float, and a value that would not
    read back (an infinite stamp) is a ValueError here instead of a hole in the record.
    """
    key = KEYS[type(value)]
    try:
        body = _ENCODE(_DECODERS[key].decode(_ENCODE(value)))
    except msgspec.ValidationError as error:
        raise ValueError(f"{value!r} cannot be recorded: {error}") from error
    return (*key, body.decode())


def decode(kind: str, name: str, body: str) -> Value:
    """The value of an entry. JournalError where this version knows no such value."""
    decoder = _DECODERS.get((kind, name))
    if decoder is None:
        raise JournalError(f'The record holds a {kind} "{name}", which this version of Trundle does not know.')
    try:
        value: Value = decoder.decode(body)
    except msgspec.MsgspecError as error:
        raise JournalError(f'The record holds a {kind} "{name}" that cannot be read: {error}.') from error
    return value


def pack_points(points: tuple[Point, ...]) -> bytes:
    """Points as little-endian float32 pairs, x before y."""
    return struct.pack(f"<{2 * len(points)}f", *chain.from_iterable(points))


def unpack_points(blob: bytes) -> tuple[Point, ...]:
    """The points of `pack_points`, each rounded to float32."""
    numbers = struct.unpack(f"<{len(blob) // 4}f", blob)
    return tuple(zip(numbers[::2], numbers[1::2], strict=True))


def as_recorded(seen: Seen) -> Seen:
    """Telemetry as the track can keep it: route and obstacles rounded to float32, all else as it is.

    Whoever feeds the engine feeds it this, so that what the record gives back is exactly what the engine was told.
    """
    return Seen(
        seen.stamp,
        seen.pose,
        seen.spread,
        seen.speed,
        seen.battery,
        seen.driven,
        seen.remaining,
        seen.route_number,
        unpack_points(pack_points(seen.route)),
        unpack_points(pack_points(seen.obstacles)),
    )
