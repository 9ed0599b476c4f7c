"""The program of PROTOCOL.md, section 12: taken out of the page, so that what is written is what is tried.

It imports pyzmq and the standard library and nothing of this project.
"""

from __future__ import annotations

import re
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

PROTOCOL = Path(__file__).parents[3] / "backends" / "link" / "PROTOCOL.md"


def program() -> str:
    """The text of the program."""
    found = re.search(r"```python\n(.*?)```", PROTOCOL.read_text(encoding="utf-8"), re.DOTALL)
    assert found is not None
    return found[1]


def changed(*changes: tuple[str, str]) -> str:
    """The program with some of its text replaced; each must be there exactly once."""
    text = program()
    for before, after in changes:
        assert text.count(before) == 1, before
        text = text.replace(before, after)
    return text


@contextmanager
def adapter(text: str, folder: Path) -> Iterator[str]:
    """The program running in a process of its own; its address."""
    with restartable(text, folder) as (address, _):
        yield address


@contextmanager
def restartable(text: str, folder: Path) -> Iterator[tuple[str, Callable[[], None]]]:
    """The same, and what kills the program and starts it again."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "adapter.py").write_text(text, encoding="utf-8")
    address = f"ipc://{folder}/socket"
    processes: list[subprocess.Popen[bytes]] = []

    def start() -> None:
        stop(processes)
        (folder / "socket").unlink(missing_ok=True)
        processes.append(subprocess.Popen([sys.executable, str(folder / "adapter.py"), address]))
        wait_for(folder / "socket")

    try:
        start()
        yield address, start
    finally:
        stop(processes)


def stop(processes: list[subprocess.Popen[bytes]]) -> None:
    """Kill those that still run."""
    for process in processes:
        process.kill()
        process.wait()


def wait_for(path: Path, seconds: float = 60.0) -> None:
    """Until a file is there."""
    end = time.monotonic() + seconds
    while not path.exists():
        assert time.monotonic() < end, f"{path} did not appear"
        time.sleep(0.02)
