"""Tells the system's service manager that the run is ready and alive, where it asks to be told.

The protocol is a datagram of KEY=VALUE lines to the socket that NOTIFY_SOCKET names (systemd's sd_notify(3)); one that
begins with @ is in the abstract name space. WATCHDOG_USEC is how often it wants a sign of life, in microseconds.
"""

from __future__ import annotations

import os
import socket
import time
from collections.abc import Mapping


class ServiceManager:
    """Who started this process, if it wants to be told anything. Nothing that goes wrong here reaches the run."""

    def __init__(self, environment: Mapping[str, str] = os.environ) -> None:
        self._address = environment.get("NOTIFY_SOCKET", "")
        own = environment.get("WATCHDOG_PID", str(os.getpid())) == str(os.getpid())
        microseconds = environment.get("WATCHDOG_USEC", "") if own else ""
        self._every = int(microseconds) / 2e6 if microseconds.isdigit() and int(microseconds) > 0 else None
        self._next = 0.0

    def ready(self) -> None:
        """The run has begun."""
        self._send("READY=1")

    def alive(self) -> None:
        """The loop that owns the run has come round. Sent twice as often as is asked for, and no more often."""
        if self._every is not None and time.monotonic() >= self._next:
            self._next = time.monotonic() + self._every
            self._send("WATCHDOG=1")

    def stopping(self) -> None:
        """The run is at its end."""
        self._send("STOPPING=1")

    def _send(self, line: str) -> None:
        if not self._address:
            return
        address = "\0" + self._address[1:] if self._address.startswith("@") else self._address
        try:
            with socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM | socket.SOCK_CLOEXEC) as sender:
                sender.settimeout(0.5)
                sender.sendto(line.encode(), address)
        except OSError:
            return
