"""Whatever a file holds, reading it gives a value or a `LanguageError` that can be shown; nothing else, and soon.

`TRUNDLE_FUZZ_SECONDS` sets how long to look for counterexamples, 20 by default. `python -m tests.language.search` looks
longer, and at time and memory too.
"""

from __future__ import annotations

import os
import random
import time

from hypothesis import given, settings
from hypothesis import strategies as st

from tests.language import everything
from tests.language.mutations import BEGINNINGS, check, mutated, read_as_mission
from tests.language.search import Search, look

SECONDS = float(os.environ.get("TRUNDLE_FUZZ_SECONDS", "20"))


def test_the_mission_that_uses_everything_is_read_and_compiled() -> None:
    assert check(everything.MISSION, (read_as_mission,)) == [None]


@given(st.sampled_from(BEGINNINGS), st.randoms(use_true_random=False))
@settings(max_examples=300, deadline=None)
def test_a_mutated_file_gives_a_value_or_diagnostics(text: str, source: random.Random) -> None:
    check(mutated(source, text))


@given(st.text(max_size=200))
@settings(max_examples=300, deadline=None)
def test_any_text_gives_a_value_or_diagnostics(text: str) -> None:
    check(text)


def test_no_mutation_found_in_the_time_given_breaks_the_reader() -> None:
    seed = int.from_bytes(os.urandom(4))
    source = random.Random(seed)  # noqa: S311
    ends = time.monotonic() + SECONDS
    tried = 0
    while time.monotonic() < ends:
        text = mutated(source, source.choice(BEGINNINGS))
        try:
            check(text)
        except Exception as error:
            raise AssertionError(f"seed {seed}, text number {tried}: {text!r}") from error
        tried += 1
    assert tried > 0


def test_the_long_search_finds_nothing_in_a_sample() -> None:
    search = look(seed=int.from_bytes(os.urandom(4)), count=300)
    assert (search.tried, search.faults) == (300, [])
    assert isinstance(search, Search)
