"""The control socket: commands answered and done once, watchers that cost nothing, floods that change nothing."""

from __future__ import annotations

import signal
import stat
import subprocess
import sys
import threading
import time
import uuid
from collections.abc import Iterator
from pathlib import Path

import pytest
import zmq

from runner.host.address import NAME, control_address
from runner.host.launch import Order, planned
from runner.host.messages import BYTES_MOST, VERSION, Deed, Do, Done, Fault, Look, News, decode_told, encode
from runner.host.process import start
from runner.host.remote import RemoteSource, UnreachableError, do, look
from runner.host.view import Health
from runner.journal.reader import open_record
from runner.machine.compiler import compile_mission
from runner.machine.table import Event
from runner.site.values import Conditions
from tests.builders import FAR, HOME, mission, repeat, visit


@pytest.fixture
def running(tmp_path: Path) -> Iterator[Path]:
    """A run in a process of its own, on the simulated robot, which is aborted at the end."""
    written = mission(repeat(visit([FAR, HOME]), times=500))
    folder = tmp_path / ("a-run-with-a-long-name-" * 4)
    start(planned(Order(written, compile_mission(written), Conditions(), None, 1, 2.0), folder.name), folder)
    yield folder
    try:
        do(folder, Deed.ABORT)
    except UnreachableError:
        return


def exchange(folder: Path, *frames: bytes, seconds: float = 2.0) -> list[object]:
    """Send frames as they are; what comes back."""
    context = zmq.Context()
    with control_address(folder) as address, context.socket(zmq.DEALER) as socket:
        socket.setsockopt(zmq.LINGER, 0)
        socket.connect(address)
        for frame in frames:
            socket.send(frame)
        told: list[object] = []
        while len(told) < len(frames) and socket.poll(int(seconds * 1000)):
            told.append(decode_told(socket.recv()))
    context.term()
    return told


def names_of(folder: Path, *names: str) -> list[object]:
    with open_record(folder) as record:
        return [entry.value for entry in record.entries(names=names)]


def test_only_its_owner_can_reach_a_run(running: Path) -> None:
    assert stat.S_IMODE(running.stat().st_mode) == 0o700
    assert stat.S_IMODE((running / NAME).stat().st_mode) == 0o600


def test_the_same_command_again_is_answered_again_and_done_once(running: Path) -> None:
    asked = encode(Do(VERSION, uuid.uuid4().hex, "mara (pts/3)", Deed.HOLD))
    answers = [*exchange(running, asked), *exchange(running, asked), *exchange(running, asked)]
    assert [isinstance(answer, Done) and answer.accepted for answer in answers] == [True, True, True]
    assert len(names_of(running, "operator")) == 1
    assert names_of(running, "operator")[0].who == "mara (pts/3)"  # type: ignore[attr-defined]


def test_what_is_not_understood_is_answered_in_words_and_changes_nothing(running: Path) -> None:
    wrong = [b"", b"{", b"[]", b'{"v":1}', b'{"v":1,"ask":"look","watcher":"w","who":"m","after":-1}']
    wrong += [b'{"v":1,"ask":"do","id":"1","who":"m","deed":"fly"}', b"[" * 20_000, b"\xff\xfe" * 100]
    assert all(isinstance(told, Fault) for told in exchange(running, *wrong))
    (other,) = exchange(running, b'{"v":2,"ask":"look"}')
    assert isinstance(other, Fault)
    assert "version 2" in other.text
    assert exchange(running, b"x" * (BYTES_MOST + 1), seconds=0.3) == []
    assert isinstance(look(running), News)


def test_hold_release_skip_say_and_abort_are_answered_with_what_came_of_them(running: Path) -> None:
    assert do(running, Deed.HOLD).accepted
    assert do(running, Deed.RELEASE).accepted
    assert not do(running, Deed.RELEASE).accepted
    assert do(running, Deed.SAY, "the lift was being cleaned").accepted
    assert not do(running, Deed.SAY, " ").accepted
    assert not do(running, Deed.ANSWER, "yes").accepted
    assert do(running, Deed.ABORT).accepted
    assert [remark.text for remark in names_of(running, "remarked")] == ["the lift was being cleaned"]  # type: ignore[attr-defined]


def test_a_watcher_sees_the_run_acts_on_it_and_learns_of_its_end(running: Path) -> None:
    with RemoteSource(running) as source:
        wait_until(lambda: source.view() is not None and source.feed())
        source.act(Event.HOLD)
        wait_until(lambda: source.view().health is Health.HELD)  # type: ignore[union-attr]
        assert source.age() < 1.0
        do(running, Deed.ABORT)
        wait_until(lambda: source.view().outcome is not None)  # type: ignore[union-attr]
        assert source.view().outcome == "aborted"  # type: ignore[union-attr]


FROZEN = """
import sys, time
from pathlib import Path
from runner.host.remote import RemoteSource
with RemoteSource(Path(sys.argv[1])) as source:
    while source.view() is None: time.sleep(0.01)
    print("up", flush=True)
    time.sleep(60)
"""


def test_watchers_that_freeze_or_die_are_dropped_and_the_run_goes_on(running: Path) -> None:
    watchers = [
        subprocess.Popen([sys.executable, "-c", FROZEN, str(running)], stdout=subprocess.PIPE, text=True)
        for _ in range(2)
    ]
    try:
        for watcher in watchers:
            assert watcher.stdout is not None
            watcher.stdout.readline()
        assert look(running).watchers == 3
        watchers[0].send_signal(signal.SIGSTOP)
        watchers[1].kill()
        before = look(running).view
        wait_until(lambda: look(running).watchers == 1, seconds=15.0)
        after = look(running).view
        assert before is not None
        assert after is not None
        assert after.stamp > before.stamp + 2.0
    finally:
        for watcher in watchers:
            watcher.kill()
            watcher.communicate()


def test_a_flood_does_not_keep_an_abort_from_its_run(running: Path) -> None:
    stop = threading.Event()
    flood = threading.Thread(target=pour, args=(running, stop))
    flood.start()
    try:
        time.sleep(0.5)
        assert do(running, Deed.ABORT).accepted
    finally:
        stop.set()
        flood.join()
    assert names_of(running, "ended")


def pour(folder: Path, stop: threading.Event) -> None:
    """As many questions and nonsense as the line takes."""
    context = zmq.Context()
    question = encode(Look(VERSION, "flood", "flood"))
    with control_address(folder) as address, context.socket(zmq.DEALER) as socket:
        socket.setsockopt(zmq.LINGER, 0)
        socket.connect(address)
        while not stop.is_set():
            for frame in (question, b"nonsense" * 100):
                try:
                    socket.send(frame, zmq.NOBLOCK)
                except zmq.Again:
                    time.sleep(0.0001)
    context.term()


def wait_until(true: object, seconds: float = 10.0) -> None:
    end = time.monotonic() + seconds
    while not true():  # type: ignore[operator]
        assert time.monotonic() < end
        time.sleep(0.02)
