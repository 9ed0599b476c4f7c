"""Tells people outside: a command that is run, or a web address that is posted to, with the event as JSON.

A command is an argument list, run without a shell, with the event on its standard input. Each telling happens in a
thread of its own, has a time limit, and is tried again some times; whatever comes of it, the run is not touched. What
became of each is a line in the run's folder.
"""

from __future__ import annotations

import contextlib
import os
import signal
import subprocess
import threading
import time
import urllib.request
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

import msgspec

LIMIT_S = 10.0
RESTS_S = (1.0, 5.0)
"""Rests between the tries: so there are three."""
UNDER_WAY_MOST = 8
"""More tellings at once are given up: a robot that gets into trouble every second is no reason to start a thousand."""
LOG = "told.txt"


@dataclass(frozen=True, slots=True)
class Occasion:
    """What a hook is told. `what` is "trouble" or "end"; `kind` is a word or two that a script may rely on."""

    what: str
    kind: str
    text: str
    run: str
    mission: str
    stamp: float
    time: datetime


class Teller:
    """Tells hooks, in the background."""

    def __init__(self, folder: Path, limit: float = LIMIT_S, rests: Sequence[float] = RESTS_S) -> None:
        self._log = folder / LOG
        self._limit = limit
        self._rests = tuple(rests)
        self._threads: list[threading.Thread] = []

    def tell(self, hook: Sequence[str], occasion: Occasion) -> None:
        """Begin to tell, and return at once."""
        self._threads = [thread for thread in self._threads if thread.is_alive()]
        if not hook or len(self._threads) >= UNDER_WAY_MOST:
            return
        thread = threading.Thread(target=self._tell, args=(tuple(hook), occasion), name="hook", daemon=True)
        self._threads.append(thread)
        thread.start()

    def finish(self) -> None:
        """Wait for what is still being told, no longer than its limits allow."""
        until = time.monotonic() + (len(self._rests) + 1) * (self._limit + 1.0) + sum(self._rests)
        for thread in self._threads:
            thread.join(max(until - time.monotonic(), 0.0))

    def _tell(self, hook: tuple[str, ...], occasion: Occasion) -> None:
        event = msgspec.json.encode(occasion)
        problem = ""
        for number, rest in enumerate((0.0, *self._rests), 1):
            time.sleep(rest)
            problem = self._try(hook, event)
            self._note(f"{occasion.what} ({occasion.kind}), try {number}: {hook[0]}: {problem or 'told'}")
            if not problem:
                return

    def _try(self, hook: tuple[str, ...], event: bytes) -> str:
        """Tell once; what went wrong, or nothing."""
        try:
            if is_address(hook):
                return _post(hook[0], event, self._limit)
            return _run(hook, event, self._limit)
        except Exception as error:  # whatever a hook does, it is no matter of the run's
            return f"{type(error).__name__}: {error}"

    def _note(self, line: str) -> None:
        with contextlib.suppress(OSError), self._log.open("a", encoding="utf-8") as log:
            log.write(f"{datetime.now().astimezone().isoformat(timespec='seconds')}  {line}\n")


def is_address(hook: Sequence[str]) -> bool:
    """Whether a hook is a web address rather than a command."""
    return len(hook) == 1 and hook[0].startswith(("http://", "https://"))


def _post(address: str, event: bytes, limit: float) -> str:
    request = urllib.request.Request(  # noqa: S310  only addresses that is_address let through come here
        address, data=event, headers={"Content-Type": "application/json"}, method="POST"
    )
    with urllib.request.urlopen(request, timeout=limit) as answer:  # noqa: S310
        return "" if 200 <= answer.status < 300 else f"answered {answer.status}"


def _run(arguments: Sequence[str], event: bytes, limit: float) -> str:
    process = subprocess.Popen(  # noqa: S603  the person who started the run chose it; no shell reads it
        arguments,
        stdin=subprocess.PIPE,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        start_new_session=True,
    )
    try:
        process.communicate(event, timeout=limit)
    except subprocess.TimeoutExpired:
        with contextlib.suppress(ProcessLookupError):
            os.killpg(process.pid, signal.SIGKILL)
        process.wait()
        return f"stopped after {limit:g} s"
    return "" if process.returncode == 0 else f"exit code {process.returncode}"
