"""The engine's state as bytes and back, so that a run can be gone on with after its process died.

MessagePack, because JSON has no infinity and registers may hold one. The form follows the dataclass itself: a new
field of the state needs no word here, as long as it is made of values that msgspec knows.
"""

from __future__ import annotations

import msgspec

from runner.engine.state import EngineState

_ENCODE = msgspec.msgpack.Encoder().encode
_DECODER = msgspec.msgpack.Decoder(EngineState)


def state_to_bytes(state: EngineState) -> bytes:
    """The state, whole."""
    return _ENCODE(state)


def state_from_bytes(data: bytes) -> EngineState:
    """The state of those bytes. ValueError where they are of another version of the program, or damaged."""
    try:
        return _DECODER.decode(data)
    except msgspec.MsgspecError as error:
        raise ValueError(f"This is no state of the engine that this version knows: {error}.") from error
