"""The pacer holds virtual time back to the pace asked for."""

from __future__ import annotations

from runner.host.pacing import Pacer


def test_without_a_pace_nothing_is_ever_waited_for() -> None:
    assert Pacer(None, 0.0).ahead(1e9) == 0.0


def test_virtual_time_ahead_of_the_pace_is_waited_for() -> None:
    assert 9.0 < Pacer(10.0, 100.0).ahead(200.0) <= 10.0


def test_holding_slows_to_real_time_and_releasing_goes_back_without_a_jump() -> None:
    pacer = Pacer(None, 0.0)
    pacer.hold(True, 500.0)
    assert 0.9 < pacer.ahead(501.0) <= 1.0
    pacer.hold(False, 501.0)
    assert pacer.ahead(9999.0) == 0.0
