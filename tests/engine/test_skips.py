"""What a person skips or holds changes nothing in what comes after it."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from runner.engine.values import Ended
from runner.language.expressions import Quantity
from runner.language.mission import Step, Wait
from runner.machine.table import Event
from tests.builders import compare, condition, mark, repeat, wait
from tests.engine.driver import Driver, start

NEVER = condition(compare(Quantity.ELAPSED, ">", 1e6))


def wait_up_to(seconds: float) -> Wait:
    return Wait(mark(), None, NEVER, seconds)


def skipped_after_a_minute(*steps: Step) -> Driver:
    driver = start(*steps)
    driver.pass_time(60.0)
    driver.person(Event.SKIP)
    return driver


def has_ended(driver: Driver) -> bool:
    return any(isinstance(effect, Ended) for effect in driver.effects)


@pytest.mark.parametrize("make", [wait, wait_up_to])
def test_a_wait_after_a_skipped_one_lasts_its_own_time(make: Callable[[float], Wait]) -> None:
    driver = skipped_after_a_minute(make(600.0), make(1200.0))
    driver.pass_time(1_199.0)
    assert not has_ended(driver)
    driver.pass_time(2.0)
    assert has_ended(driver)


def test_a_pause_after_a_skipped_one_lasts_until_the_next_lap() -> None:
    driver = skipped_after_a_minute(repeat(wait(10.0), times=3, every=100.0))
    driver.pass_time(99.0)  # the second lap began at 60 s, so the third is due at 160 s
    driver.pass_time(10.0)
    assert not has_ended(driver)
    driver.pass_time(2.0)
    assert has_ended(driver)


def test_a_clock_time_that_comes_while_the_mission_is_held_is_not_waited_for_until_the_next_day() -> None:
    half_past_six = condition(compare(Quantity.CLOCK, ">=", 18.5 * 3600.0))
    driver = start(Wait(mark(), None, half_past_six))
    driver.pass_time(1_200.0)
    driver.person(Event.HOLD)
    driver.pass_time(1_200.0)
    driver.person(Event.RELEASE)
    driver.pass_time(2.0)
    assert has_ended(driver)
