"""A simulated run is held against the truth: each diagnosis, and where the robot believed to be."""

from __future__ import annotations

import math
import sqlite3
from pathlib import Path

import pytest

from runner.engine.values import Ended, IncidentBegan, IncidentEnded, LegBegan, LegEnded, StepBegan
from runner.journal.reader import chain_break, open_record
from runner.journal.writer import JournalWriter
from runner.machine.table import Ending, Event, Outcome
from runner.report.summary import summary_of
from runner.report.text import report_text
from runner.report.truth import AGREEING, truth_score
from runner.report.values import Incident, Summary
from runner.site.values import Pose
from tests.journal.records import MACHINE, SOURCES, header, seen

HERE = Pose(2.0, 2.1, 0.3)
REMEMBERED = "remembered obstacle that was gone"


def incident(number: int, began: float, diagnosis: str) -> Incident:
    return Incident(number, 1, "ward", began, None, None, Event.STALLED, "", seconds=20.0, diagnosis=diagnosis)


def run_with(folder: Path, diagnosis: str, causes: list[tuple[float, str]], off: float = 0.0) -> Summary:
    """A run with one incident from 100 s to 130 s, and these causes from these stamps on; the robot is `off` meters
    from where it believes to be."""
    with JournalWriter.create(folder, header(), SOURCES, MACHINE) as writer:
        writer.write(0.0, [StepBegan(0, "go ward east", 3), LegBegan(1, 0, "ward east")])
        for stamp, cause in causes:
            writer.track(seen(stamp))
            writer.truth(stamp + 0.05, Pose(HERE.x + off, HERE.y, HERE.heading), cause)
            writer.track(seen(stamp + 0.25))
        writer.write(100.0, [IncidentBegan(1, 1, Event.STALLED, "", HERE, 9.0)])
        writer.write(130.0, [IncidentEnded(1, 1, True, "rest 30 s", 30.0, diagnosis, ())])
        writer.write(140.0, [LegEnded(1, 0, "ward east", Outcome.ARRIVED, "", 140.0, 20.0, 1, 1)])
        writer.write(140.0, [Ended(Ending.COMPLETED, "all steps done")])
    with open_record(folder) as record:
        assert chain_break(record) is None
        return summary_of(record)


@pytest.mark.parametrize(
    ("diagnosis", "causes", "right"),
    [
        ("route blocked", [(0.0, ""), (95.0, "carton in the way"), (130.0, "")], True),
        ("route blocked", [(0.0, ""), (95.0, "wheels stuck"), (130.0, "")], False),
        (REMEMBERED, [(95.0, "person in the way"), (110.0, "remembered obstacle that is gone")], True),
        (REMEMBERED, [(0.0, ""), (95.0, "person in the way"), (131.0, "")], False),
        ("unknown", [(0.0, "")], True),
        ("unknown", [(0.0, ""), (95.0, "slip")], False),
        ("swaying between routes", [(0.0, "")], None),
    ],
)  # fmt: skip
def test_a_diagnosis_is_right_where_it_agrees_with_what_was_the_case(
    tmp_path: Path, diagnosis: str, causes: list[tuple[float, str]], right: bool | None
) -> None:
    truth = run_with(tmp_path, diagnosis, causes).truth
    assert truth is not None
    assert [score.right for score in truth.scores] == [right]


def test_a_cause_that_held_for_a_moment_is_not_what_it_was_about(tmp_path: Path) -> None:
    causes = [(90.0, "slip"), (91.0, "carton in the way"), (130.0, "")]
    truth = run_with(tmp_path, "wheel trouble", causes).truth
    assert truth is not None
    assert truth.scores[0].really == ("carton in the way",)


def test_how_far_the_robot_was_from_where_it_believed_to_be_is_told(tmp_path: Path) -> None:
    causes = [(float(stamp), "") for stamp in range(0, 100, 5)]
    truth = run_with(tmp_path, "unknown", causes, off=0.3).truth
    assert truth is not None
    off = truth.whereabouts
    assert off is not None
    assert (off.readings, off.mean, off.most) == (20, pytest.approx(0.3), pytest.approx(0.3))
    assert off.heading_mean == pytest.approx(0.0, abs=1e-9)


def test_the_page_of_a_simulated_run_ends_with_the_truth_and_that_of_a_robot_does_not(tmp_path: Path) -> None:
    page = report_text(run_with(tmp_path / "sim", "route blocked", [(0.0, ""), (95.0, "slip"), (130.0, "")], off=0.02))
    assert "0 of 1 agree" in page
    assert "not route blocked. Really: slip" in page
    assert "off by 2.0 cm on average" in page
    assert max(map(len, page.splitlines())) <= 80
    assert "Truth" not in report_text(run_with(tmp_path / "real", "route blocked", []))


def test_a_record_from_before_there_was_a_truth_still_opens_and_goes_on(tmp_path: Path) -> None:
    run_with(tmp_path, "route blocked", [(0.0, "")])
    with sqlite3.connect(tmp_path / "journal.sqlite") as connection:
        connection.execute("DROP TABLE truth")
    connection.close()
    with open_record(tmp_path) as record:
        assert list(record.truths()) == []
        assert summary_of(record).truth is None
    with JournalWriter.resume(tmp_path) as writer:
        writer.truth(150.0, HERE, "")
    with open_record(tmp_path) as record:
        assert [row.stamp for row in record.truths()] == [150.0]


def test_the_truth_is_bounded_as_the_track_is(tmp_path: Path) -> None:
    with JournalWriter.create(tmp_path, header(), SOURCES, MACHINE) as writer:
        for stamp in range(0, 10_000, 100):
            writer.track(seen(float(stamp)))
            writer.truth(float(stamp), HERE, "")
            if stamp % 1000 == 0:
                writer.snapshot(float(stamp), b"state", track_seconds=2500.0)
    with open_record(tmp_path) as record:
        stamps = [row.stamp for row in record.truths()]
        assert 6000.0 <= stamps[0] <= 7000.0
        assert stamps[-1] == 9900.0


def test_every_diagnosis_that_the_engine_can_give_is_scored_or_left_out_on_purpose() -> None:
    from runner.engine import diagnosis

    names = {row.name for row in diagnosis._TABLE}
    assert names - set(AGREEING) <= {"swaying between routes"}


def test_without_any_truth_there_is_no_score() -> None:
    assert truth_score([incident(1, 100.0, "unknown")], [], []) is None


def test_heading_is_compared_over_the_full_turn(tmp_path: Path) -> None:
    folder = tmp_path / "turn"
    with JournalWriter.create(folder, header(), SOURCES, MACHINE) as writer:
        writer.track(seen(1.0, pose=Pose(0.0, 0.0, math.pi - 0.01)))
        writer.truth(1.1, Pose(0.0, 0.0, -math.pi + 0.01), "")
        writer.track(seen(1.25, pose=Pose(0.0, 0.0, math.pi - 0.01)))
    with open_record(folder) as record:
        score = truth_score([], record.truths(), record.track())
    assert score is not None
    assert score.whereabouts is not None
    assert score.whereabouts.heading_mean == pytest.approx(0.02)
