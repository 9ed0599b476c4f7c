"""A run started and watched over SSH, by a daemon of the test's own on loopback. Skipped where there is no sshd."""

from __future__ import annotations

import os
import pwd
import shutil
import signal
import socket
import subprocess
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

import pytest

from runner.host.remote import look
from runner.journal.outcome import RunOutcome
from runner.journal.runs import find_run
from tests.faults.test_terminals import TRUNDLE, outcome, stop, until
from tests.screen.test_real_terminal import Terminal

SSHD = shutil.which("sshd", path=os.environ.get("PATH", "") + ":/usr/sbin:/sbin")
pytestmark = pytest.mark.skipif(
    SSHD is None or shutil.which("ssh") is None or os.geteuid() != 0,
    reason="needs sshd, ssh and the rights to start a session (openssh-server, as root)",
)


@dataclass(frozen=True, slots=True)
class Line:
    """How to reach the daemon."""

    words: tuple[str, ...]

    def run(self, *command: str) -> subprocess.CompletedProcess[str]:
        return subprocess.run([*self.words, *command], capture_output=True, text=True, timeout=90.0, check=False)

    @contextmanager
    def terminal(self, command: str) -> Iterator[tuple[Terminal, subprocess.Popen[bytes]]]:
        """A command on a terminal at the other end of the line."""
        terminal = Terminal(80, 24)
        process = subprocess.Popen(
            [*self.words, "-tt", command], stdin=terminal.there, stdout=terminal.there, stderr=terminal.there,
            start_new_session=True, env={**os.environ, "TERM": "xterm-256color"},
        )  # fmt: skip
        os.close(terminal.there)
        try:
            yield terminal, process
        finally:
            process.kill()
            process.wait()
            os.close(terminal.here)


@pytest.fixture
def line(tmp_path: Path) -> Iterator[Line]:
    """A daemon with a key of its own, on loopback only, that lets one key in."""
    home = tmp_path / "ssh"
    home.mkdir(mode=0o700)
    for name in ("host", "user"):
        subprocess.run(["ssh-keygen", "-q", "-t", "ed25519", "-N", "", "-f", str(home / name)], check=True)
    shutil.copy(home / "user.pub", home / "allowed")
    with socket.socket() as free:
        free.bind(("127.0.0.1", 0))
        port = free.getsockname()[1]
    (home / "config").write_text(
        f"Port {port}\nListenAddress 127.0.0.1\nHostKey {home}/host\nAuthorizedKeysFile {home}/allowed\n"
        f"PidFile {home}/pid\nStrictModes no\nUsePAM no\nPasswordAuthentication no\nPermitRootLogin yes\n"
    )
    Path("/run/sshd").mkdir(exist_ok=True)
    assert SSHD is not None
    daemon = subprocess.Popen([SSHD, "-D", "-e", "-f", str(home / "config")], stderr=subprocess.DEVNULL)
    who = pwd.getpwuid(os.geteuid()).pw_name
    options = ["StrictHostKeyChecking=no", f"UserKnownHostsFile={home}/known", "BatchMode=yes", "LogLevel=ERROR"]
    words = ["ssh", "-p", str(port), "-i", str(home / "user"), *(part for one in options for part in ("-o", one))]
    made = Line((*words, f"{who}@127.0.0.1"))
    try:
        end = time.monotonic() + 10.0
        while made.run("true").returncode != 0:
            if time.monotonic() > end:
                pytest.skip("the daemon of the test lets nobody in here")
            time.sleep(0.1)
        yield made
    finally:
        daemon.terminate()
        daemon.wait()


def test_a_run_started_over_ssh_lives_on_when_the_line_dies_and_is_aborted_over_another(
    line: Line, tmp_path: Path
) -> None:
    runs = tmp_path / "runs"
    trundle = f"TRUNDLE_RUNS={runs} {TRUNDLE}"
    started = line.run(f"{trundle} run evening-round --pace 2 --detach")
    assert started.returncode == 0, started.stderr
    folder = find_run(runs)
    try:
        with line.terminal(f"{trundle} watch") as (terminal, process):
            terminal.read_until("on the way", 60.0)
            os.killpg(process.pid, signal.SIGKILL)
        before = look(folder, 5.0).view
        time.sleep(1.0)
        after = look(folder, 5.0).view
        assert before is not None
        assert after is not None
        assert after.stamp > before.stamp, "the run did not notice"
        with line.terminal(f"{trundle} watch") as (terminal, process):
            terminal.read_until("on the way", 60.0)
            terminal.type(b"h")
            until(terminal, folder, held=True)
            terminal.type(b"r")
            until(terminal, folder, held=False)
            terminal.type(b"a")
            terminal.read(0.5)
            terminal.type(b"y")
            end = time.monotonic() + 20.0
            while outcome(folder) is not RunOutcome.ABORTED:
                assert time.monotonic() < end
                terminal.read(0.1)
    finally:
        stop(folder)
