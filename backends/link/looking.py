"""A look at a robot without taking control of it: who it says it is, and how good the line to it is."""

from __future__ import annotations

import time
from collections.abc import Iterator
from statistics import median

import zmq

from backends.contract import BackendError, Line
from backends.link.client import keys_of
from backends.link.messages import VERSION, About, Hello, MessageError, encode, read_by_controller
from backends.link.sockets import check_line, controller_socket

EVERY_S = 0.1
PATIENCE_S = 5.0


def look(line: Line, seconds: float) -> Iterator[str]:
    """Lines for a person. BackendError where nobody answers."""
    keys = keys_of(line)
    check_line(line.address, keys is not None, line.insecure)
    context: zmq.Context[zmq.Socket[bytes]] = zmq.Context()
    socket = controller_socket(context, line.address, keys)
    try:
        about = _greeting(socket, PATIENCE_S)
        if about is None:
            raise BackendError(
                f"No robot answers at {line.address} within {PATIENCE_S:.0f} s, or it does not admit us."
            )
        yield from _introduction(about[0])
        yield _quality(socket, seconds)
    finally:
        context.destroy(linger=0)


def _introduction(about: About) -> Iterator[str]:
    where = f" on {about.site}" if about.site else ""
    yield f"{about.name}{where}, at most {about.speed:g} m/s"
    yield f"can also: {', '.join(about.abilities) or 'nothing'}"
    yield f"stops {about.silence:g} s after its controller fell silent, and gives it up after {about.term:g} s"
    if about.simulated is not None:
        yield f"simulated, {about.simulated.pace:g} seconds a second"


def _quality(socket: zmq.Socket[bytes], seconds: float) -> str:
    end = time.monotonic() + seconds
    trips, asked = [], 0
    while time.monotonic() < end:
        asked += 1
        found = _greeting(socket, 1.0)
        if found is not None:
            trips.append(found[1])
        time.sleep(EVERY_S)
    if not trips:
        return f"line: none of {asked} greetings was answered"
    worst = max(trips) * 1e3
    return f"line: round trip {median(trips) * 1e3:.1f} ms, at worst {worst:.1f} ms; {len(trips)} of {asked} answered"


def _greeting(socket: zmq.Socket[bytes], patience: float) -> tuple[About, float] | None:
    """Who answered, and how long it took; None for nobody."""
    begun = time.monotonic()
    sent = False
    while time.monotonic() - begun < patience:
        try:
            if not sent:
                socket.send(encode(Hello([VERSION])), zmq.NOBLOCK)
                sent, begun = True, time.monotonic()
        except zmq.Again:
            time.sleep(0.01)
            continue
        if socket.poll(100):
            try:
                message = read_by_controller(socket.recv())
            except MessageError:
                continue
            if isinstance(message, About):
                return message, time.monotonic() - begun
    return None
