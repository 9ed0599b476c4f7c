"""A line that can be cut: a forwarder of TCP connections on loopback, in a thread of its own.

A cut is one of two kinds, as in life: the line is stuck (what is sent waits and comes late), or the connection breaks
and new ones are refused until the cut is over.
"""

from __future__ import annotations

import contextlib
import selectors
import socket
import threading
import time


class Proxy:
    """Forwards what comes in on `port` to another port of this computer."""

    def __init__(self, target: int) -> None:
        self._target = target
        self._listener = socket.create_server(("127.0.0.1", 0))
        self.port: int = self._listener.getsockname()[1]
        self._pairs: dict[socket.socket, socket.socket] = {}
        self._stuck_until = 0.0
        self._broken_until = 0.0
        self._stopped = threading.Event()
        self._thread = threading.Thread(target=self._run, daemon=True)
        self._thread.start()

    def cut(self, seconds: float, breaks: bool) -> None:
        """Cut the line for so long."""
        if breaks:
            self._broken_until = time.monotonic() + seconds
        else:
            self._stuck_until = time.monotonic() + seconds

    def close(self) -> None:
        self._stopped.set()
        self._thread.join()
        self._drop_all()
        self._listener.close()

    def _run(self) -> None:
        while not self._stopped.is_set():
            now = time.monotonic()
            if now < self._broken_until:
                self._drop_all()
            if now < max(self._broken_until, self._stuck_until):
                time.sleep(0.005)
                continue
            self._forward()

    def _forward(self) -> None:
        with selectors.DefaultSelector() as selector:
            for end in (self._listener, *self._pairs):
                selector.register(end, selectors.EVENT_READ)
            ready = [key.fileobj for key, _ in selector.select(0.01)]
        for end in ready:
            if end is self._listener:
                self._accept()
            elif isinstance(end, socket.socket) and end in self._pairs:
                self._pass_on(end)

    def _accept(self) -> None:
        near, _ = self._listener.accept()
        try:
            far = socket.create_connection(("127.0.0.1", self._target), timeout=1.0)
        except OSError:
            near.close()
            return
        self._pairs[near], self._pairs[far] = far, near

    def _pass_on(self, end: socket.socket) -> None:
        try:
            data = end.recv(65_536)
            if data:
                self._pairs[end].sendall(data)
                return
        except OSError:
            pass
        self._drop(end)

    def _drop(self, end: socket.socket) -> None:
        for one in (end, self._pairs.pop(end)):
            self._pairs.pop(one, None)
            with contextlib.suppress(OSError):
                one.close()

    def _drop_all(self) -> None:
        while self._pairs:
            self._drop(next(iter(self._pairs)))


def free_port() -> int:
    """A port that nobody listens on at this moment."""
    with socket.create_server(("127.0.0.1", 0)) as listener:
        return int(listener.getsockname()[1])
