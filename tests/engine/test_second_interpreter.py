"""A second interpreter, written from LANGUAGE.md alone, says the same as the engine to whatever happens."""

from __future__ import annotations

from collections import Counter

import pytest

from tests.engine.second_interpreter.comparing import compare

MISSIONS_A_PART = 500


@pytest.mark.parametrize("part", range(4))
def test_two_interpreters_of_the_language_agree_on_random_missions_after_every_input(part: int) -> None:
    seen: Counter[str] = Counter()
    for seed in range(part * MISSIONS_A_PART, (part + 1) * MISSIONS_A_PART):
        try:
            compare(seed, seen, sequences=3)
        except Exception as error:
            raise AssertionError(
                f"python -m tests.engine.second_interpreter --count 1 --seed {seed}: {error}"
            ) from error
    assert seen["inputs"] > 5000
