"""Frames: what was sent is what is read, and nothing else is ever read or raised."""

from __future__ import annotations

import contextlib

import pytest
from hypothesis import given
from hypothesis import strategies as st

from backends.link.messages import (
    FRAME_BYTES_MOST,
    Beat,
    Go,
    MessageError,
    Take,
    encode,
    read_by_controller,
    read_by_robot,
)
from backends.link.trial.attempt import framed

counts = st.integers(0, 2**53 - 1)
stamps = st.floats(0.0, 1e9)
tokens = st.text("0123456789abcdef", min_size=32, max_size=32)
sessions = st.text("azAZ09._-", min_size=8, max_size=64)
poses = st.tuples(st.floats(-1e5, 1e5), st.floats(-1e5, 1e5), st.floats(-3.15, 3.15))
sent = st.one_of(
    st.builds(Beat, tokens, stamps, stamps, counts),
    st.builds(Go, tokens, counts, stamps, counts, poses, st.floats(0.001, 10.0), st.booleans()),
    st.builds(Take, st.just(1), sessions, tokens, st.text(max_size=90),
              st.floats(0.01, 10.0), st.integers(1, 100)),
)  # fmt: skip


@given(sent)
def test_what_was_sent_is_what_is_read(message: Beat | Go | Take) -> None:
    assert read_by_robot(encode(message)) == message


@given(st.one_of(st.binary(max_size=300), st.binary(max_size=300).map(framed)))
def test_any_bytes_are_a_message_or_an_error_with_a_code(frame: bytes) -> None:
    for read in (read_by_robot, read_by_controller):
        with contextlib.suppress(MessageError):
            read(frame)


@given(sent, st.data())
def test_no_changed_byte_goes_unnoticed(message: Beat | Go | Take, data: st.DataObject) -> None:
    frame = bytearray(encode(message))
    frame[data.draw(st.integers(0, len(frame) - 1))] ^= data.draw(st.integers(1, 255))
    with pytest.raises(MessageError) as raised:
        read_by_robot(bytes(frame))
    assert raised.value.code == "not readable"


@pytest.mark.parametrize(
    ("body", "code"),
    [
        (b'{"kind":"beat"}', "not valid"),
        (b'{"kind":"dance"}', "unknown message"),
        (b'{"kind":"hello","versions":[1],"versions":["a"]}', "not valid"),
        (b'{"kind":"hello","versions":[1e400]}', "not valid"),
        (b'{"kind":"hello","versions":[NaN]}', "not readable"),
        (b"[" * 60_000, "not valid"),
        (b" " * FRAME_BYTES_MOST, "not readable"),
        (b'{"kind":"take","version":1,"session":"abcdefgh\\n","nonce":"x"}', "not valid"),
    ],
)
def test_each_kind_of_mistake_has_its_code(body: bytes, code: str) -> None:
    with pytest.raises(MessageError) as raised:
        read_by_robot(framed(body))
    assert raised.value.code == code
