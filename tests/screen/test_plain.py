"""The run as plain lines."""

from __future__ import annotations

import io
import subprocess
import sys
from dataclasses import replace

from backends.contract import LineQuality
from runner.host.view import FeedLine, Weight
from runner.screen.plain import PlainPrinter
from tests.screen.scripted import ENDED, FEED, MOVING, NEEDS_YOU, TROUBLE, driving


def _printed(lines: list[FeedLine], every: float = 60.0) -> str:
    stream = io.StringIO()
    PlainPrinter(stream, every).show(lines, None)
    return stream.getvalue()


def test_a_feed_line_is_its_time_and_its_text() -> None:
    assert _printed([FEED[0]]) == "03:10:40  Began lap 2 of repeat until 05:30.\n"


def test_what_is_not_ascii_is_spelled_with_ascii() -> None:
    line = FeedLine(0.0, "03:00:00", Weight.PLAIN, "Küche \u2192 Büro \u2014 2 \u00d7 90 \u2026 \u6771")
    assert _printed([line]) == "03:00:00  Kuche -> Buro - 2 x 90 ... ?\n"


def test_a_robot_cannot_steer_the_terminal_or_forge_a_line() -> None:
    line = FeedLine(0.0, "03:00:00", Weight.TROUBLE, "failed:\x1b[2J\x9b1mdone\n04:00:00  all is well")
    printed = _printed([line])
    assert printed.count("\n") == 1
    assert "\x1b" not in printed
    assert "\x9b" not in printed


def test_progress_is_told_where_the_feed_was_silent_for_a_minute_of_the_run() -> None:
    stream = io.StringIO()
    printer = PlainPrinter(stream, every=10.0)
    printer.show(FEED, None)
    for view in driving():
        printer.show([], view)
    lines = stream.getvalue().splitlines()[len(FEED) :]
    stamps = [line[:8] for line in lines]
    assert stamps == ["03:12:10", "03:12:20", "03:12:30"]
    assert lines[0] == (
        "03:12:10  moving: driving to laboratory; 24 m to laboratory; leg 0:10 of 4:00; battery 83 %; "
        "lap 2 of 8; 9 legs arrived, 1 incident; repeats until about 05:17"
    )


def test_progress_tells_of_the_line_to_a_robot_that_has_one() -> None:
    stream = io.StringIO()
    line = LineQuality(0.0041, 0.312, -2.5, 0.002, 0.9)
    PlainPrinter(stream, every=1.0).show([], replace(MOVING, line=line, stamp=1000.0))
    assert (
        stream.getvalue().rstrip().endswith("; line 4.1 ms, at worst 312 ms, 10 % of beats lost, clocks -2.500 s apart")
    )


def test_what_a_person_is_needed_for_is_said_once_with_how_to_act() -> None:
    stream = io.StringIO()
    printer = PlainPrinter(stream, every=1e6)
    for view in (NEEDS_YOU, NEEDS_YOU, MOVING, TROUBLE, TROUBLE):
        printer.show([], view)
    assert stream.getvalue().splitlines() == [
        "03:12:22  needs you: Tray taken at laboratory?; answer with: trundle answer yes | no | come again",
        "03:12:22  needs you: Nothing has been heard from the robot for 31 s.; "
        "trundle release goes on, trundle abort ends it",
    ]


def test_that_no_news_come_is_said_once_and_when_they_come_again_too() -> None:
    stream = io.StringIO()
    printer = PlainPrinter(stream, every=1e6)
    for age in (0.1, 4.0, 5.0, 6.0, 0.1, 0.2):
        printer.show([], MOVING, age)
    assert stream.getvalue().splitlines() == [
        "03:12:22  no news for 0:04, since 03:12:22; keeps trying",
        "03:12:22  there is news again",
    ]


def test_no_progress_is_told_of_a_run_that_has_ended() -> None:
    stream = io.StringIO()
    PlainPrinter(stream).show([], ENDED)
    assert stream.getvalue() == ""


def test_a_closed_stream_is_no_error() -> None:
    stream = io.StringIO()
    stream.close()
    printer = PlainPrinter(stream)
    printer.show(FEED, MOVING)
    printer.show(FEED, replace(MOVING, stamp=9000.0))
    assert printer.gone


def test_a_reader_that_goes_away_stops_the_lines_but_not_the_program() -> None:
    program = (
        "import sys\n"
        "from runner.screen.plain import PlainPrinter\n"
        "from tests.screen.scripted import FEED\n"
        "printer = PlainPrinter(sys.stdout)\n"
        "while not printer.gone:\n"
        "    printer.show(FEED, None)\n"
        "sys.exit(7)\n"
    )
    with subprocess.Popen(
        [sys.executable, "-c", program], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        assert process.stdout is not None
        assert process.stderr is not None
        assert process.stdout.readline() == "03:10:40  Began lap 2 of repeat until 05:30.\n"
        process.stdout.close()
        assert process.stderr.read() == ""
        assert process.wait(timeout=20) == 7
