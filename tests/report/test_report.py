"""A report says what happened, from the record alone. The expected pages lie in `golden/`, to be read by eye.

After a change that is meant: `TRUNDLE_NEW_GOLDEN=1 pytest tests/report`, then read the difference.
"""

from __future__ import annotations

import argparse
import json
import os
from dataclasses import fields, replace
from pathlib import Path

import pytest

from runner.cli import report as report_command
from runner.cli import runs as runs_command
from runner.engine.values import Ended, LegBegan, LegEnded, OperatorActed, StepBegan
from runner.journal.outcome import RunOutcome
from runner.journal.reader import open_record
from runner.journal.writer import JournalWriter
from runner.machine.table import Ending, Outcome
from runner.report.summary import summary_of
from runner.report.text import report_text, span
from runner.report.values import Summary
from tests.journal.records import (
    MACHINE,
    SOURCES,
    Moment,
    hard_night,
    header,
    leg_that_fails,
    smooth_start,
    stall_mended_by_replanning,
    write_run,
)

GOLDEN = Path(__file__).parent / "golden"
RUN_ID = header().run_id


def summed_up(tmp_path: Path, moments: list[Moment]) -> Summary:
    with open_record(write_run(tmp_path / RUN_ID, moments)) as record:
        return summary_of(record)


def broken_off() -> list[Moment]:
    """The hard night up to the recovery that would have ended the stall."""
    return [*smooth_start(), *stall_mended_by_replanning()[:5]]


@pytest.mark.parametrize(
    ("name", "moments"),
    [
        ("hard_night", hard_night()),
        ("smooth", [*smooth_start(), (65.0, [Ended(Ending.COMPLETED, "all steps done")])]),
        ("broken_off", broken_off()),
    ],
)
def test_the_page_reads_as_expected(tmp_path: Path, name: str, moments: list[Moment]) -> None:
    page = report_text(summed_up(tmp_path, moments))
    expected = GOLDEN / f"{name}.txt"
    if os.environ.get("TRUNDLE_NEW_GOLDEN"):
        expected.write_text(page)
    assert page == expected.read_text()


def test_no_line_is_wider_than_a_terminal_and_all_is_ascii_whatever_the_names(tmp_path: Path) -> None:
    long = "Überwachungszentrale ½ " * 8
    moments: list[Moment] = [
        (0.0, [StepBegan(0, f"go {long}", 3), LegBegan(1, 0, long)]),
        (9.0, [LegEnded(1, 0, long, Outcome.FAILED, f"der Gang vor {long} war zu", 9.0, 123456.7, 12, 123)]),
        (9.0, [StepBegan(1, f"wait for {long}", 4), Ended(Ending.COMPLETED, long)]),
    ]
    page = report_text(summed_up(tmp_path, moments))
    assert page.isascii()
    assert max(map(len, page.splitlines())) <= 80
    assert "Uberwachungszentrale" in page


def test_an_incident_says_which_recoveries_were_tried_and_which_one_ended_it(tmp_path: Path) -> None:
    mended, given_up = summed_up(tmp_path, hard_night()).incidents
    assert [(attempt.recovery, attempt.began) for attempt in mended.attempts] == [
        ("clear 3 m", 110.0),
        ("replan", 123.0),
    ]
    assert (mended.recovered, mended.ended_by, mended.destination) == (True, "replan", "laboratory")
    assert mended.near is not None
    assert mended.near[0] == "ward east"
    assert mended.near[1] == pytest.approx(5.7617, abs=1e-4)  # from (24.26, 12.5) to (30, 12)
    assert (given_up.recovered, given_up.ended_by) == (False, "nothing: the leg failed")
    assert [attempt.tries for attempt in given_up.attempts] == [1, 2]


def test_a_leg_that_did_not_arrive_names_what_came_next(tmp_path: Path) -> None:
    legs = summed_up(tmp_path, hard_night()).legs
    assert [(leg.number, leg.outcome, leg.next) for leg in legs if leg.next] == [
        (3, Outcome.FAILED, "go laboratory (line 8)"),
        (4, Outcome.SKIPPED, "go ward east (line 9)"),
        (5, Outcome.ABORTED, "the mission ended"),
    ]


def test_the_four_times_add_up_and_each_moment_counts_once(tmp_path: Path) -> None:
    totals = summed_up(tmp_path, hard_night()).totals
    assert totals.held == 30.0  # held at 350, skipped at 380
    assert totals.recovering == 41.0 + 110.0
    assert totals.waiting == 20.0  # from 65 to 85
    assert totals.driving == 420.0 - 30.0 - 151.0 - 20.0
    assert totals.driving + totals.recovering + totals.held + totals.waiting == totals.seconds == 420.0


def test_only_actions_that_meant_something_count_as_interventions(tmp_path: Path) -> None:
    summary = summed_up(tmp_path, hard_night())
    assert [(one.who, one.action, one.accepted) for one in summary.interventions] == [
        ("mara", "hold", True),
        ("mara", "hold", False),
        ("mara", "skip", True),
        ("night desk", "abort", True),
    ]
    assert summary.totals.interventions == 3


def test_distance_and_battery_are_the_robots_own_counters(tmp_path: Path) -> None:
    totals = summed_up(tmp_path, hard_night()).totals
    assert totals.meters == 210.0
    assert (totals.battery_first, totals.battery_last) == (0.95, 0.95 - 0.042)


def test_a_run_that_goes_on_is_reported_as_far_as_it_went_and_says_so(tmp_path: Path) -> None:
    with JournalWriter.create(tmp_path / RUN_ID, header(), SOURCES, MACHINE) as writer:
        for stamp, values in broken_off():
            writer.write(stamp, values)
        with open_record(writer.path) as record:
            summary = summary_of(record)
    assert summary.outcome is RunOutcome.RUNNING
    assert summary.incidents[0].recovered is None
    page = report_text(summary)
    assert "still running, 2:03 so far: everything below may still change" in page.replace("\n" + " " * 16, " ")
    assert "Ended         not in this record" in page


def test_a_run_ended_by_an_error_gives_the_error_as_the_reason(tmp_path: Path) -> None:
    writer = JournalWriter.create(tmp_path / RUN_ID, header(), SOURCES, MACHINE)
    writer.write(0.0, smooth_start()[0][1])
    writer.close("the disk is full")
    with open_record(writer.path) as record:
        summary = summary_of(record)
    assert (summary.outcome, summary.reason) == (RunOutcome.BROKEN_OFF, "the disk is full")
    assert "(the disk is full)" in report_text(summary)


def test_a_run_of_which_nothing_is_recorded_yet_can_be_reported(tmp_path: Path) -> None:
    JournalWriter.create(tmp_path / RUN_ID, header(), SOURCES, MACHINE).close()
    with open_record(tmp_path / RUN_ID) as record:
        page = report_text(summary_of(record))
    assert "Legs: none\n\nIncidents: none\n\nInterventions: none\n" in page
    assert "Battery       not known" in page


def test_a_hold_is_over_when_it_is_released(tmp_path: Path) -> None:
    moments: list[Moment] = [
        *smooth_start(),
        (70.0, [OperatorActed("hold", "mara", True)]),
        (95.0, [OperatorActed("release", "mara", True)]),
        (100.0, [Ended(Ending.COMPLETED, "all steps done")]),
    ]
    totals = summed_up(tmp_path, moments).totals
    assert (totals.held, totals.waiting, totals.driving) == (25.0, 10.0, 65.0)


@pytest.mark.parametrize(("seconds", "text"), [(None, "-"), (0.4, "0:00"), (59.6, "1:00"), (3599.7, "1:00:00")])
def test_durations_round_to_seconds_and_carry(seconds: float | None, text: str) -> None:
    assert span(seconds) == text


# --- the commands ---------------------------------------------------------------------------------------------


@pytest.fixture
def runs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("TRUNDLE_RUNS", str(tmp_path))
    return tmp_path


def command(*words: str) -> int:
    parser = argparse.ArgumentParser()
    subparsers = parser.add_subparsers(dest="command")
    for module in (report_command, runs_command):
        module.add_parser(subparsers)
    arguments = parser.parse_args(words)
    return report_command.run(arguments) if arguments.command == "report" else runs_command.run(arguments)


def test_report_shows_the_latest_run(runs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_run(runs / RUN_ID, hard_night())
    assert command("report") == 0
    assert capsys.readouterr().out == (GOLDEN / "hard_night.txt").read_text()


def test_report_as_json_holds_the_same(runs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_run(runs / RUN_ID, hard_night())
    assert command("report", RUN_ID, "--json") == 0
    told = json.loads(capsys.readouterr().out)
    assert set(told) == {field.name for field in fields(Summary)}
    assert told["outcome"] == "aborted"
    assert [leg["outcome"] for leg in told["legs"]] == ["arrived", "arrived", "failed", "skipped", "aborted"]
    assert told["incidents"][0]["ended_by"] == "replan"
    assert told["incidents"][0]["attempts"][0] == {"recovery": "clear 3 m", "began": 110.0, "rung": 1, "tries": 1}
    assert told["totals"]["seconds"] == 420.0


def test_report_of_an_unknown_run_is_the_users_mistake_and_no_traceback(
    runs: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert command("report", "nothing") == 2
    assert 'There is no run "nothing"' in capsys.readouterr().err


def test_runs_lists_how_each_run_came_out(runs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_run(runs / RUN_ID, hard_night())
    write_run(runs / f"{RUN_ID}-2", [*smooth_start(), *leg_that_fails(), (331.0, [Ended(Ending.COMPLETED, "done")])])
    (runs / "broken").mkdir()
    (runs / "broken" / "journal.sqlite").write_bytes(b"no database")
    os.utime(runs / "broken" / "journal.sqlite", (0.0, 0.0))
    assert command("runs") == 0
    assert capsys.readouterr().out == (
        "Run (with date and time of its start)   Mission           Outcome        Legs\n"
        "evening-specimen-20261201-093000-2      Evening specim..  legs missed    1/2\n"
        "evening-specimen-20261201-093000        Evening specim..  aborted        2/5\n"
        "broken                                                    not readable   -\n"
    )


def test_runs_as_json_gives_mission_times_outcome_and_legs(runs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_run(runs / RUN_ID, hard_night())
    assert command("runs", "--json") == 0
    assert json.loads(capsys.readouterr().out) == [
        {
            "run_id": RUN_ID,
            "mission": "Evening specimen round",
            "started": "2026-12-01T09:30:00+01:00",
            "begins": "2026-12-01T23:58:00",
            "outcome": "aborted",
            "legs_arrived": 2,
            "legs_ended": 5,
            "trouble": "",
            "now": None,
        }
    ]


def test_runs_without_any_says_where_it_looked(runs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert command("runs") == 0
    assert capsys.readouterr().out == f"There are no runs in {runs} yet.\n"


def test_the_longest_ids_still_fit_a_line_of_80_columns(runs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    name = "donaudampfschifffahr-20261201-093000-2"
    with JournalWriter.create(runs / name, replace(header(name), mission="D" * 60), SOURCES, MACHINE) as writer:
        for leg in range(99):
            writer.write(0.0, [LegEnded(leg, 0, "x", Outcome.ARRIVED, "", 1.0, 1.0, 1, 0)])
        assert command("runs") == 0
    assert max(map(len, capsys.readouterr().out.splitlines())) <= 80
