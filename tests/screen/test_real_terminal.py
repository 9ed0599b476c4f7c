"""The screen as a real process on a real pseudo-terminal, read by a terminal emulator."""

from __future__ import annotations

import fcntl
import os
import pty
import re
import select
import signal
import struct
import subprocess
import sys
import termios
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pyte
import pytest

from runner.cli.exits import Exit
from runner.engine.values import Halt, OperatorActed
from runner.journal.reader import open_record

SGR_COLORS = re.compile(rb"\x1b\[([0-9;]*)m")

TOLD = ("NO_COLOR", "TRUNDLE_ASCII", "LC_ALL", "COLUMNS", "LINES")
"""What the environment may say of a terminal; here only the terminal itself is asked."""


class Terminal:
    """A pseudo-terminal of a size, with what was written to it and how it looks now."""

    def __init__(self, columns: int, rows: int) -> None:
        self.here, self.there = pty.openpty()
        fcntl.ioctl(self.there, termios.TIOCSWINSZ, struct.pack("HHHH", rows, columns, 0, 0))
        self._screen = pyte.Screen(columns, rows)
        self._stream = pyte.ByteStream(self._screen)
        self.written = b""

    def text(self) -> str:
        return "\n".join(self._screen.display)

    def type(self, keys: bytes) -> None:
        os.write(self.here, keys)

    def read_until(self, wanted: str, seconds: float = 30.0) -> str:
        """Read until the text is on the screen. Fails with what is there instead."""
        end = time.monotonic() + seconds
        while wanted not in self.text():
            assert time.monotonic() < end, f"{wanted!r} did not appear:\n{self.text()}"
            self.read(0.1)
        return self.text()

    def read(self, seconds: float) -> None:
        if select.select([self.here], [], [], seconds)[0]:
            try:
                data = os.read(self.here, 65536)
            except OSError:  # the other side has closed
                return
            self.written += data
            # pyte takes the private answers that are asked for here as text
            self._stream.feed(re.sub(rb"\x1b\[[<>=?][0-9;]*[a-zA-Z$]+p?", b"", data))


@contextmanager
def _watching(
    scene: str, columns: int = 80, rows: int = 24, program: str = "", arguments: Sequence[str] = (), **environment: str
) -> Iterator[tuple[Terminal, subprocess.Popen[bytes]]]:
    terminal = Terminal(columns, rows)
    kept = {name: value for name, value in os.environ.items() if name not in TOLD}
    process = subprocess.Popen(
        [sys.executable, *(("-c", program) if program else ("-m", "tests.screen.scripted", scene)), *arguments],
        stdin=terminal.there,
        stdout=terminal.there,
        stderr=terminal.there,
        env={**kept, "TERM": "xterm-256color", "LANG": "C.UTF-8", "LC_CTYPE": "C.UTF-8", **environment},
        start_new_session=True,
    )
    os.close(terminal.there)
    try:
        yield terminal, process
    finally:
        if process.poll() is None:
            process.send_signal(signal.SIGKILL)
        process.wait(timeout=10)
        os.close(terminal.here)


def _ended(terminal: Terminal, process: subprocess.Popen[bytes]) -> int:
    end = time.monotonic() + 10
    while process.poll() is None and time.monotonic() < end:
        terminal.read(0.1)
    return process.wait(timeout=1)


def test_a_screen_is_read_suspended_and_left_by_keys() -> None:
    with _watching("driving") as (terminal, process):
        terminal.read_until("M O V I N G")
        terminal.read_until("go to laboratory")
        terminal.type(b"?")
        terminal.read_until("more below")
        terminal.type(b"\x1b")
        terminal.read_until("q  leave")
        terminal.type(b"\x03")
        terminal.read_until("Abort the run?")
        terminal.type(b"\x03")
        terminal.read_until("abort: sent")
        terminal.type(b"m")
        terminal.read_until("mouse on")
        assert b"\x1b[?1000h" in terminal.written
        terminal.type(b"k")
        terminal.read_until("copied:")
        assert b"\x1b]52;c;" in terminal.written
        terminal.type(b"q")
        assert _ended(terminal, process) == 0


def test_ctrl_z_gives_the_shell_back_and_the_screen_returns() -> None:
    with _watching("moving") as (terminal, process):
        terminal.read_until("q  leave")
        terminal.type(b"\x1a")
        end = time.monotonic() + 10.0
        while not _stopped(process.pid):
            assert time.monotonic() < end, "it did not stop"
            terminal.read(0.05)
        before = len(terminal.written)
        process.send_signal(signal.SIGCONT)
        while b"\x1b[?1049h" not in terminal.written[before:]:
            assert time.monotonic() < end + 10.0, "it did not return"
            terminal.read(0.05)
        terminal.type(b"q")
        assert _ended(terminal, process) == 0


def _stopped(process_id: int) -> bool:
    """Whether the system has the process as stopped (proc(5), third field of stat)."""
    return Path(f"/proc/{process_id}/stat").read_text().rsplit(")", 1)[1].split()[0] == "T"


def test_an_abort_typed_into_the_real_program_halts_and_ends_the_run(tmp_path: Path) -> None:
    program = "import sys; from runner.cli import main; sys.exit(main(sys.argv[1:]))"
    command = ["run", "evening-round", "--conditions", "quiet", "--seed", "3"]
    runs = tmp_path / "runs"
    with _watching("", program=program, arguments=command, TRUNDLE_RUNS=str(runs)) as (terminal, process):
        terminal.read_until("M O V I N G", 120.0)
        terminal.type(b"a")
        terminal.read_until("Abort the run?")
        terminal.type(b"y")
        terminal.read_until("E N D E D   aborted")
        terminal.read_until("trundle report")
        terminal.type(b"q")
        assert _ended(terminal, process) == Exit.ABORTED
    (folder,) = runs.iterdir()
    with open_record(folder) as record:
        values = [entry.value for entry in record.entries()]
    (acted,) = (value for value in values if isinstance(value, OperatorActed))
    assert (acted.action, acted.accepted) == ("abort", True)
    after = values[values.index(acted) :]
    assert any(isinstance(value, Halt) for value in after)


def test_no_color_means_none_at_all() -> None:
    with _watching("recovering", NO_COLOR="1") as (terminal, process):
        terminal.read_until("R E C O V E R I N G")
        terminal.read_until("q  leave")
        terminal.type(b"q")
        assert _ended(terminal, process) == 0
    codes = {code for group in SGR_COLORS.findall(terminal.written) for code in group.split(b";")}
    assert codes <= {b"", b"0", b"1", b"2", b"4", b"7", b"39", b"49"}
    assert b"7" in codes


def test_with_color_only_the_terminals_own_sixteen_are_used() -> None:
    with _watching("recovering") as (terminal, process):
        terminal.read_until("q  leave")
        terminal.type(b"q")
        assert _ended(terminal, process) == 0
    codes = {code for group in SGR_COLORS.findall(terminal.written) for code in group.split(b";")}
    assert b"47" in codes
    assert not codes & {b"38", b"48"}


@pytest.mark.parametrize("environment", [{"TRUNDLE_ASCII": "1"}, {"LC_ALL": "C"}], ids=["by wish", "by locale"])
def test_ascii_terminals_get_ascii_only(environment: dict[str, Any]) -> None:
    with _watching("moving", **environment) as (terminal, process):
        text = terminal.read_until("q  leave")
        assert "laboratory" in text
        terminal.type(b"q")
        assert _ended(terminal, process) == 0
    assert terminal.written.isascii()


def test_at_60_by_20_nothing_essential_is_missing() -> None:
    with _watching("held", 60, 20) as (terminal, _):
        text = terminal.read_until("leave")
    for wanted in (
        "HELD",
        "to laboratory, 14 m to go",
        "your turn: r releases",
        "03:12:22",
        "try 1 of 3",
        "r release",
    ):
        assert wanted in text


def test_a_screen_that_breaks_says_so_to_its_caller_and_gives_the_terminal_back() -> None:
    program = (
        "from runner.screen.watch import watch\n"
        "from tests.screen.scripted import MOVING, Replay, showing\n"
        "class Broken(Replay):\n"
        "    def feed(self):\n"
        "        raise RuntimeError('no news any more')\n"
        "print('went well:', watch(showing(), Broken([MOVING])))\n"
    )
    with _watching("", program=program) as (terminal, process):
        terminal.read_until("went well: False")
        assert _ended(terminal, process) == 0
