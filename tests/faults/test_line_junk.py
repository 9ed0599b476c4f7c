"""What nobody should send: malformed frames by the thousand, and clients whose keys are not on the list."""

from __future__ import annotations

import json
import resource
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from random import Random
from tempfile import TemporaryDirectory

import pytest
import zmq

from backends.link.keys import make_pair, public_of, read_allowed, read_public, read_secret
from backends.link.messages import Beat, Go, Halt, Hello, Take, encode
from backends.link.server import Listening, RobotServer
from backends.link.sockets import Keys, controller_socket
from backends.link.trial.attempt import framed
from tests.backends.link.rig import Rig, corrupted
from tests.backends.link.toy import PointRobot

TOKEN = "0" * 32
ODD_VALUES = (None, True, -1, 1e308, -0.0, 2**63, 2**80, "", "x" * 5000, [], [[]], {}, [1e999], "\ud800", "\0", 0.5)


def messages(lease: str) -> list[bytes]:
    """Sound frames to be spoiled, with the token in force, so that only what is wrong with them keeps them out."""
    return [
        encode(Hello([1])),
        encode(Take(1, "junk-session", TOKEN, "junk", 0.1, 5)),
        encode(Beat(lease, 1.0, 1.0, 1)),
        encode(Go(lease, 1_000_000, 1.0, 1_000_000, (1.0, 2.0, 0.5), 0.5)),
        encode(Halt(lease, 1_000_000)),
    ]


def spoiled(random: Random, sound: bytes) -> bytes:
    """A frame that is not right in one of many ways."""
    kind = random.randrange(8)
    if kind == 0:
        return random.randbytes(random.randrange(200))
    if kind == 1:
        return corrupted(sound, random)
    if kind == 2:
        return sound[: random.randrange(len(sound))]
    if kind == 3:
        return framed(corrupted(sound[4:], random))
    if kind == 4:
        return framed(b"[" * random.choice((10, 2_000, 60_000)))
    message = json.loads(sound[4:])
    name = random.choice(list(message))
    if kind == 5:
        del message[name]
    elif kind == 6:
        message[name] = random.choice(ODD_VALUES)
    else:
        message[random.choice(("more", "", "Kind"))] = random.choice(ODD_VALUES)
    return framed(json.dumps(message).encode())


def flood(frames: int, seed: int) -> Rig:
    """A robot with a controller, and somebody who sends spoiled frames under the controller's own name."""
    rig, random = Rig(), Random(seed)  # noqa: S311  a test's chance, not a secret
    controller = rig.controller()
    rig.run(1.0)
    lease = controller._lease
    assert lease is not None
    sound = messages(lease.lease)
    for number in range(frames):
        for _, answer in rig.side.receive(b"junk", "", spoiled(random, random.choice(sound))):
            assert len(answer) < 1000
        if number % 1000 == 0:
            rig.run(0.1)
    rig.run(1.0)
    return rig


def sound_after_all(rig: Rig) -> bool:
    """The controller has its lease, and the robot was never sent anywhere but where a sound frame led."""
    return rig.side.leased and rig.controllers[b"a"].ready and len(rig.point.drives) <= 1


def test_malformed_frames_are_counted_and_change_nothing() -> None:
    rig = flood(10_000, seed=1)
    assert rig.side.counts.malformed > 5_000
    assert sound_after_all(rig)


@pytest.mark.soak
def test_a_million_malformed_frames_neither_crash_it_nor_fill_its_memory() -> None:
    flood(50_000, seed=2)
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    rig = flood(1_000_000, seed=3)
    after = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    print(f"{rig.side.counts}; most memory {before} kB after 50,000 frames, {after} kB after a million more")
    assert sound_after_all(rig)
    assert after < before * 1.1


# --- keys


@contextmanager
def keyed_robot(folder: Path) -> Iterator[tuple[RobotServer, str]]:
    """A robot that admits `host` and nobody else, served in a thread."""
    for name in ("robot", "host", "stranger"):
        make_pair(folder, name)
    secret = read_secret(folder / "robot.secret")
    address = f"ipc://{folder}/robot"
    listening = Listening(address, Keys(secret, public_of(secret)), read_allowed(folder / "host.public"))
    server = RobotServer(PointRobot(time.monotonic), listening, time.monotonic)
    stopped = threading.Event()
    thread = threading.Thread(target=server.run, args=(stopped,))
    thread.start()
    try:
        yield server, address
    finally:
        stopped.set()
        thread.join()


def keys_of(folder: Path, name: str) -> Keys:
    secret = read_secret(folder / f"{name}.secret")
    return Keys(secret, public_of(secret), read_public(folder / "robot.public"))


def greeted(socket: zmq.Socket[bytes], patience_ms: int) -> bool:
    """Whether the robot answers."""
    if not socket.poll(patience_ms, zmq.POLLOUT):
        return False
    socket.send(encode(Hello([1])))
    return bool(socket.poll(patience_ms)) and bool(socket.recv())


def strangers(attempts: int) -> tuple[int, int, int]:
    """How many attempts of strangers the robot counted, how many were served, and how many greetings of its rightful
    controller went unanswered meanwhile."""
    with TemporaryDirectory(prefix="tjk") as name, keyed_robot(folder := Path(name)) as (server, address):
        context: zmq.Context[zmq.Socket[bytes]] = zmq.Context()
        rightful = controller_socket(context, address, keys_of(folder, "host"))
        assert greeted(rightful, 10_000)
        served = unanswered = 0
        for number in range(attempts):
            wrong = keys_of(folder, "stranger") if number % 3 else None
            socket = controller_socket(context, address, wrong)
            seen = server.gate.refused if server.gate else 0
            if number % 3:
                _until(lambda seen=seen: server.gate is not None and server.gate.refused > seen)  # type: ignore[misc]
            served += greeted(socket, 1)
            socket.close()
            if number % 10 == 0:
                unanswered += not greeted(rightful, 5_000)
        assert server.gate is not None
        refused = server.gate.refused
        context.destroy(linger=0)
        assert server.gate.admitted == 1
        return refused, served, unanswered


def _until(holds: object, seconds: float = 5.0) -> None:
    end = time.monotonic() + seconds
    while callable(holds) and not holds() and time.monotonic() < end:
        time.sleep(0.0005)


def test_strangers_are_not_served_and_the_rightful_controller_is() -> None:
    refused, served, unanswered = strangers(60)
    assert refused >= 40
    assert (served, unanswered) == (0, 0)


@pytest.mark.soak
def test_ten_thousand_attempts_of_strangers() -> None:
    refused, served, unanswered = strangers(10_000)
    print(f"10,000 attempts: {refused} refused by key, the others spoke plain text; {served} served; "
          f"{unanswered} of 1,000 greetings of the rightful controller unanswered")  # fmt: skip
    assert (served, unanswered) == (0, 0)
