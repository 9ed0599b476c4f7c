"""Telling people outside: commands and web addresses, with limits, and no effect on the run."""

from __future__ import annotations

import http.server
import json
import sys
import threading
import time
from datetime import datetime
from pathlib import Path

from runner.host.hooks import LOG, Occasion, Teller

OCCASION = Occasion("trouble", "robot silent", "Nothing was heard.", "a-run", "Evening", 12.5, datetime(2026, 12, 1, 3))


def told(folder: Path, *hook: str, limit: float = 5.0, rests: tuple[float, ...] = ()) -> str:
    teller = Teller(folder, limit, rests)
    teller.tell(hook, OCCASION)
    teller.finish()
    return (folder / LOG).read_text()


def test_a_command_gets_the_event_on_its_input_and_no_shell_reads_it(tmp_path: Path) -> None:
    kept = tmp_path / "kept; touch oops"
    program = "import sys, pathlib; pathlib.Path(sys.argv[1]).write_text(sys.stdin.read())"
    assert told(tmp_path, sys.executable, "-c", program, str(kept)).rstrip().endswith(": told")
    assert json.loads(kept.read_text())["kind"] == "robot silent"
    assert not (tmp_path / "oops").exists()


def test_a_command_that_hangs_is_stopped_with_all_that_it_started(tmp_path: Path) -> None:
    begun = time.monotonic()
    assert "stopped after 0.3 s" in told(tmp_path, "sh", "-c", "sleep 60 & sleep 60", limit=0.3)
    assert time.monotonic() - begun < 10.0


def test_a_command_that_fails_is_tried_again_and_one_that_is_not_there_is_no_matter(tmp_path: Path) -> None:
    log = told(tmp_path, "false", rests=(0.0, 0.0))
    assert log.count("exit code 1") == 3
    assert "FileNotFoundError" in told(tmp_path, "/no/such/command")


def test_a_web_address_is_posted_to(tmp_path: Path) -> None:
    bodies: list[bytes] = []

    class Receiver(http.server.BaseHTTPRequestHandler):
        def do_POST(self) -> None:
            bodies.append(self.rfile.read(int(self.headers["Content-Length"])))
            self.send_response(204)
            self.end_headers()

        def log_message(self, *_: object) -> None:
            """Say nothing."""

    server = http.server.HTTPServer(("127.0.0.1", 0), Receiver)
    threading.Thread(target=server.serve_forever, daemon=True).start()
    assert ": told" in told(tmp_path, f"http://127.0.0.1:{server.server_port}/rounds")
    server.shutdown()
    server.server_close()
    assert json.loads(bodies[0])["run"] == "a-run"
