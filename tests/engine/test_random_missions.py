"""Twenty thousand random sequences of events against random missions of every construct keep the invariants."""

from __future__ import annotations

from collections import Counter

import pytest

from tests.engine.random_missions import SEQUENCES_A_MISSION, play

MISSIONS_A_PART = 500


@pytest.mark.parametrize("part", range(4))
def test_random_events_against_random_missions_keep_the_invariants(part: int) -> None:
    seen: Counter[str] = Counter()
    for seed in range(part * MISSIONS_A_PART, (part + 1) * MISSIONS_A_PART):
        try:
            play(seed, seen)
        except Exception as error:
            raise AssertionError(f"python -m tests.engine.random_missions --count 10 --seed {seed}") from error
    assert seen["sequences"] == MISSIONS_A_PART * SEQUENCES_A_MISSION
    for kind in ("OrderEnded", "Answered", "StartCharging", "RecoveryBegan", "ended: completed", "ended: timed out"):
        assert seen[kind] > 20, f"too few of '{kind}' to say anything"
