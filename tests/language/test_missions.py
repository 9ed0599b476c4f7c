"""A mission file becomes the syntax tree it describes."""

from __future__ import annotations

from pathlib import Path

import pytest

from runner.language.diagnostics import LanguageError
from runner.language.mission import Go, Limits, Mark, Otherwise, Recovery, RecoveryKind, Repeat, Rest, Visit, Wait
from runner.language.reader import load_mission
from runner.language.rules import DEFAULT_RULE
from tests.language import texts

ROBOT_TEXT = """\
robot: Small cart
footprint: 60 cm x 44 cm
speed: 0.8 m/s
reverse speed: 0.2 m/s
acceleration: 0.6 m/s2
turn speed: 80 deg/s
turn acceleration: 160 deg/s2
lidar: {field of view: 270 deg, beams: 180, range: 12 m, rate: 8 Hz, noise: 1.5 cm}
battery: {capacity: 240 Wh, idle: 22 W, driving: 85 W, charging: 300 W}
"""

WHOLE = """\
retry rules:
  patient:
    tries: 4
    rest between tries: 20 s, doubling to 2 min
    stalled when: under 0.5 m of progress in 15 s
    recover: [replan, clear 3 m, ease back 0.4 m]
    give up after: 8 min
limits:
  speed: 0.6 m/s
  end by: 06:00
steps:
  - repeat:
      until: 05:30
      steps:
        - visit: [ward east, laboratory]
          rule: patient
          within: 4 min
          otherwise: skip
        - wait: 2 min
  - repeat: {times: 3, steps: [go: laboratory]}
  - repeat: {for: 2 h, steps: [go: laboratory]}
  - go: laboratory
    otherwise:
      - go: ward east
        otherwise: end
"""


def test_every_part_of_a_mission_is_read() -> None:
    mission = texts.mission(WHOLE)
    assert (mission.name, mission.start.name) == ("Round", "ward east")
    assert mission.limits == Limits(0.6, 21_600.0)
    until, times, lasting, go = mission.steps
    assert isinstance(until, Repeat)
    assert (until.times, until.seconds) == (None, None)
    assert isinstance(times, Repeat)
    assert (times.times, times.seconds) == (3, None)
    assert isinstance(lasting, Repeat)
    assert (lasting.times, lasting.seconds) == (None, 7_200.0)
    visit, wait = until.steps
    assert isinstance(visit, Visit)
    assert [place.name for _, place in visit.places] == ["ward east", "laboratory"]
    assert (visit.rule.name, visit.within, visit.otherwise) == ("patient", 240.0, Otherwise.SKIP)
    assert isinstance(wait, Wait)
    assert wait.seconds == 120.0
    assert isinstance(go, Go)
    assert isinstance(go.otherwise, tuple)
    inner = go.otherwise[0]
    assert isinstance(inner, Go)
    assert (inner.place.name, inner.otherwise) == ("ward east", Otherwise.END)


def test_a_retry_rule_is_read_with_its_phrases() -> None:
    rule = next(rule for rule in texts.mission(WHOLE).rules if rule.name == "patient")
    assert (rule.tries, rule.rest, rule.give_up_after) == (4, Rest(20.0, 2.0, 120.0), 480.0)
    assert (rule.stall_progress, rule.stall_window) == (0.5, 15.0)
    assert rule.recover == (
        Recovery(RecoveryKind.REPLAN),
        Recovery(RecoveryKind.CLEAR, 3.0),
        Recovery(RecoveryKind.EASE_BACK, 0.4),
    )


def test_a_step_without_a_rule_has_the_built_in_one() -> None:
    (go,) = texts.mission(texts.STEPS).steps
    assert isinstance(go, Go)
    assert (go.rule, go.within, go.otherwise) == (DEFAULT_RULE, None, None)


def test_a_mission_may_write_the_default_rule_itself() -> None:
    (go,) = texts.mission("retry rules:\n  default: {tries: 7}\n" + texts.STEPS).steps
    assert isinstance(go, Go)
    assert go.rule.tries == 7


def test_what_a_rule_leaves_out_is_as_in_the_built_in_one() -> None:
    rule = next(
        rule
        for rule in texts.mission("retry rules:\n  short: {tries: 1}\n" + texts.STEPS).rules
        if rule.name == "short"
    )
    assert (rule.tries, rule.recover, rule.give_up_after) == (1, DEFAULT_RULE.recover, DEFAULT_RULE.give_up_after)


def test_steps_keep_where_they_stand() -> None:
    go, repeat = texts.mission(
        "steps:\n  - go: ward east\n  - repeat:\n      times: 2\n      steps: [wait: 1 s]\n"
    ).steps
    assert go.mark == Mark("round.yaml", 6, 5, len("go: ward east"))
    assert repeat.mark == Mark("round.yaml", 7, 5, len("repeat"))


def test_site_and_robot_are_found_beside_the_mission(tmp_path: Path) -> None:
    (tmp_path / "floors").mkdir()
    (tmp_path / "floors" / "one.yaml").write_text(texts.SITE)
    (tmp_path / "cart.yaml").write_text(ROBOT_TEXT)
    path = tmp_path / "round.yaml"
    path.write_text(texts.HEAD.replace("floor.yaml", "floors/one.yaml") + texts.STEPS)
    mission = load_mission(path)
    assert (mission.site.name, mission.robot.name) == ("Test floor", "Small cart")
    assert mission.robot.footprint == ((0.3, 0.22), (-0.3, 0.22), (-0.3, -0.22), (0.3, -0.22))
    assert [Path(source.path).name for source in mission.sources] == ["round.yaml", "one.yaml", "cart.yaml"]
    assert mission.sources[1].text == texts.SITE


def test_problems_of_all_three_files_are_told_together(tmp_path: Path) -> None:
    (tmp_path / "floor.yaml").write_text(texts.SITE.replace("east}", "up}"))
    (tmp_path / "cart.yaml").write_text(ROBOT_TEXT.replace("0.8 m/s", "8 m/s"))
    path = tmp_path / "round.yaml"
    path.write_text(texts.HEAD + "steps:\n  - wait: 2\n")
    with pytest.raises(LanguageError) as caught:
        load_mission(path)
    found = [(Path(found.mark.file).name, found.mark.line) for found in caught.value.diagnostics]
    assert found == [("round.yaml", 6), ("floor.yaml", 5), ("cart.yaml", 3)]


def test_a_site_that_is_not_there_is_told_where_the_mission_names_it(tmp_path: Path) -> None:
    (tmp_path / "flor.yaml").write_text(texts.SITE)
    (tmp_path / "cart.yaml").write_text(ROBOT_TEXT)
    path = tmp_path / "round.yaml"
    path.write_text(texts.HEAD + texts.STEPS)
    with pytest.raises(LanguageError) as caught:
        load_mission(path)
    found = texts.only(caught.value)
    assert (found.mark.line, found.mark.column) == (2, 7)
    assert found.help == 'The nearest file in that folder is "flor.yaml".'


@pytest.mark.parametrize("name", ["nowhere.yaml", ".", "a\0b", "x" * 5_000])
def test_a_mission_that_cannot_be_opened_is_a_diagnostic(name: str, tmp_path: Path) -> None:
    with pytest.raises(LanguageError) as caught:
        load_mission(tmp_path / name)
    assert texts.only(caught.value).mark.line == 0
    assert str(caught.value).isascii()
