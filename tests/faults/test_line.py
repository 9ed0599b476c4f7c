"""Sessions over bad lines: one controller at a time, a halt that halts, and two accounts that agree."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from backends.link.duty import Duty
from backends.link.lease import Lease, LeaseDesk
from backends.link.messages import Stand
from backends.link.orders import Order, Orders
from tests.faults.line_night import Night

SAMPLE, SOAK = 100, 2_000


@pytest.mark.parametrize("tens", range(SAMPLE // 10))
def test_a_bad_line_breaks_no_promise(tens: int) -> None:
    for seed in range(10 * tens, 10 * tens + 10):
        Night(seed).run()


@pytest.mark.soak
def test_two_thousand_bad_lines_break_no_promise() -> None:
    served = 0
    for seed in range(SAMPLE, SAMPLE + SOAK):
        night = Night(seed)
        night.run()
        served += night.auditor.served
    print(f"{SOAK} sessions, {served} commands served")


def _anybody(self: LeaseDesk, token: str, peer: bytes, person: str) -> Lease | None:
    if self.lease is not None:
        self.lease.peer = peer
    return self.lease


def _too_soon(self: Duty, pose: Stand, begin: Callable[[Duty, Stand], None] = Duty._begin) -> None:
    begin(self, pose)
    self.ledger.goal_is("arrived", "", 0.0)


def _never(self: LeaseDesk, now: float) -> bool:
    return False


def _in_turn(self: Orders, order: Order) -> list[Order]:
    self.add(order)
    return []


def _nights() -> None:
    for seed in range(SAMPLE):
        Night(seed).run()


PLANTED: dict[str, tuple[type, str, object]] = {
    "a robot that obeys any token": (LeaseDesk, "holder", _anybody),
    "a robot that says it arrived when it sets out": (Duty, "_begin", _too_soon),
    "a robot that never stops by itself": (LeaseDesk, "silent", _never),
    "a halt that waits for its turn": (Orders, "halt", _in_turn),
}


@pytest.mark.parametrize("name", PLANTED)
def test_a_planted_fault_is_caught(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    owner, method, fault = PLANTED[name]
    monkeypatch.setattr(owner, method, fault)
    with pytest.raises(AssertionError, match="seed"):
        _nights()
