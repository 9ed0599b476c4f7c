"""Engine values become text and come back the same."""

from __future__ import annotations

import struct
from types import NoneType
from typing import Any, get_args, get_type_hints

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from runner.engine.values import Begin, Command, GoalNews, Halt, Input, LegEnded, Note, Seen, Tick
from runner.journal.codec import CLASSES, KEYS, as_recorded, decode, encode, pack_points, unpack_points
from runner.journal.errors import JournalError
from runner.machine.table import Event, Outcome
from runner.site.values import Pose
from tests.journal.records import seen

FINITE = st.floats(allow_nan=False, allow_infinity=False)
PLAIN: dict[Any, st.SearchStrategy[Any]] = {
    float: FINITE,
    int: st.integers(-(2**62), 2**62),
    str: st.text(),
    bool: st.booleans(),
    NoneType: st.none(),
    Event: st.sampled_from(Event),
    Outcome: st.sampled_from(Outcome),
    Pose: st.builds(Pose, FINITE, FINITE, FINITE),
}


def anything_of(annotation: Any) -> st.SearchStrategy[Any]:
    """Any value that fits the annotation of a field."""
    if annotation in PLAIN:
        return PLAIN[annotation]
    arguments = get_args(annotation)
    if not arguments:
        return st.sampled_from(annotation)
    if arguments[-1] is Ellipsis:
        return st.lists(anything_of(arguments[0]), max_size=4).map(tuple)
    if getattr(annotation, "__origin__", None) is tuple:
        return st.tuples(*map(anything_of, arguments))
    return st.one_of(*map(anything_of, arguments))


def anything_in(cls: type) -> st.SearchStrategy[Any]:
    fields = {name: anything_of(annotation) for name, annotation in get_type_hints(cls).items()}
    return st.builds(cls, **fields)


@pytest.mark.parametrize("cls", list(KEYS), ids=lambda cls: cls.__name__)
@settings(deadline=None)
@given(data=st.data())
def test_every_input_command_and_note_reads_back_as_it_was(cls: type, data: st.DataObject) -> None:
    value = data.draw(anything_in(cls))
    kind, name, body = encode(value)
    assert decode(kind, name, body) == value
    assert encode(decode(kind, name, body)) == (kind, name, body)
    assert "\n" not in body


def test_the_table_of_classes_is_the_unions_of_the_engine() -> None:
    for kind, union in (("input", Input), ("command", Command), ("note", Note)):
        assert {cls for (its_kind, _), cls in CLASSES.items() if its_kind == kind} == set(get_args(union))


def test_a_class_is_named_as_a_person_writes_it() -> None:
    assert KEYS[LegEnded] == ("note", "leg ended")
    assert KEYS[GoalNews] == ("input", "goal news")
    assert KEYS[Halt] == ("command", "halt")


def test_equal_values_give_equal_bytes_whatever_type_their_numbers_are() -> None:
    assert encode(Begin(0, 64800)) == encode(Begin(0.0, 64800.0))
    assert encode(Begin(0, 64800))[2] == '{"stamp":0.0,"clock":64800.0,"seed":0}'


def test_a_value_that_would_not_read_back_is_refused_when_it_is_written() -> None:
    with pytest.raises(ValueError, match="cannot be recorded"):
        encode(Tick(float("inf")))


def test_what_this_version_does_not_know_is_said_in_a_sentence() -> None:
    with pytest.raises(JournalError, match='a note "gripper closed", which this version of Trundle does not know'):
        decode("note", "gripper closed", "{}")
    with pytest.raises(JournalError, match='a note "leg ended" that cannot be read'):
        decode("note", "leg ended", '{"leg": "four"}')


def test_points_are_kept_as_little_endian_float32_pairs() -> None:
    assert pack_points(((1.5, -2.0),)) == struct.pack("<ff", 1.5, -2.0)
    assert pack_points(()) == b""


@settings(deadline=None)
@given(st.lists(st.tuples(st.floats(-1e6, 1e6), st.floats(-1e6, 1e6))).map(tuple))
def test_rounding_for_the_record_is_done_once_and_then_changes_nothing(points: tuple[tuple[float, float], ...]) -> None:
    rounded = as_recorded(seen(1.0, route=points, obstacles=points))
    assert as_recorded(rounded) == rounded
    assert rounded.route == unpack_points(pack_points(points))
    assert isinstance(rounded, Seen)
    assert rounded.pose == seen(1.0).pose
