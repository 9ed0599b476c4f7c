"""The steps, routines, standing orders and shared files of a mission become the values that the compiler takes."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from runner.language.diagnostics import LanguageError
from runner.language.expressions import Kind
from runner.language.mission import (
    Ask,
    Charge,
    Count,
    End,
    Go,
    Mission,
    Notify,
    Order,
    Otherwise,
    Overrun,
    Prove,
    Repeat,
    Run,
    Step,
    Then,
    Visit,
    Wait,
    When,
)
from runner.language.reader import read_mission
from runner.site.values import Place, Pose
from tests.language import everything, texts

ROUTINE = """\
routines:
  hand over:
    given: [room]
    steps:
      - go: room
      - notify: "The cart is at {room}."
"""


def step(body: str, top: str = "") -> Step:
    """The one step of a mission."""
    (found,) = texts.mission(f"{top}steps:\n{body}").steps
    return found


def problem(body: str) -> str:
    with pytest.raises(LanguageError) as caught:
        texts.mission(body)
    return texts.only(caught.value).sentence


@pytest.fixture(name="whole")
def _whole(tmp_path: Path) -> Mission:
    (tmp_path / "shared.yaml").write_text(everything.SHARED)
    return read_mission(everything.MISSION, str(tmp_path / "round.yaml"), texts.site(), texts.ROBOT)


# --- steps --------------------------------------------------------------------------------------------------------


def test_a_go_may_lead_to_a_pose() -> None:
    found = step("  - go: {x: 3 m, y: 4.5 m, facing: north}\n")
    assert isinstance(found, Go)
    assert (found.place, found.relative) == (Place("x 3 m, y 4.5 m", Pose(3.0, 4.5, math.pi / 2)), False)


@pytest.mark.parametrize(
    ("text", "x", "y"),
    [("ahead 3 m", 3.0, 0.0), ("back 50 cm", -0.5, 0.0), ("left 1 m", 0.0, 1.0), ("right 1 m", 0.0, -1.0)],
)
def test_a_go_may_be_a_move_seen_from_the_robot(text: str, x: float, y: float) -> None:
    found = step(f"  - go: {text}\n")
    assert isinstance(found, Go)
    assert (found.relative, found.place.pose.x, found.place.pose.y) == (True, x, y)


def test_a_place_called_like_a_move_is_a_place() -> None:
    site = texts.site(texts.SITE + "  back 1 m: {at: [3, 3], facing: east}\n")
    (found,) = read_mission(texts.HEAD + "steps: [go: back 1 m]\n", "round.yaml", site, texts.ROBOT).steps
    assert isinstance(found, Go)
    assert not found.relative


def test_a_visit_has_an_order_and_may_run_a_routine_for_each_place() -> None:
    found = step("  - visit: [ward east, laboratory]\n    order: shuffled\n    each: hand over\n", ROUTINE)
    assert isinstance(found, Visit)
    assert found.order is Order.SHUFFLED
    texts_told = [steps[1].text for steps in found.each if isinstance(steps[1], Notify)]
    assert texts_told == ["The cart is at ward east.", "The cart is at laboratory."]


def test_a_wait_for_a_condition_has_a_bound_and_what_follows_in_vain() -> None:
    found = step("  - wait: {until: battery >= 50 % for 5 s, up to: 10 min, otherwise: end}\n")
    assert isinstance(found, Wait)
    assert found.until is not None
    assert (found.seconds, found.until.lasting, found.up_to, found.otherwise) == (None, 5.0, 600.0, Otherwise.END)


def test_a_question_keeps_its_answers_as_words() -> None:
    found = step("  - {ask: Well, answers: [yes, no], up to: 90 s, if silent: no}\n")
    assert isinstance(found, Ask)
    assert (found.text, found.answers, found.up_to, found.if_silent) == ("Well", ("yes", "no"), 90.0, "no")


def test_a_charge_is_read() -> None:
    found = step("  - charge: {at: ward east, until: 05:00, up to: 2 h, otherwise: skip}\n")
    assert isinstance(found, Charge)
    assert (found.place.name, found.until.text, found.up_to) == ("ward east", "05:00", 7_200.0)
    assert (found.rule.name, found.otherwise) == ("default", Otherwise.SKIP)


def test_a_loop_without_a_bound_needs_an_interval_or_an_end_of_the_mission() -> None:
    found = step("  - repeat: {every: 30 min, if a lap overruns: next interval, steps: [wait: 1 s]}\n")
    assert isinstance(found, Repeat)
    assert (found.times, found.seconds, found.until) == (None, None, None)
    assert (found.every, found.overrun) == (1_800.0, Overrun.NEXT_INTERVAL)
    assert isinstance(step("  - repeat: {steps: [wait: 1 s]}\n", "limits: {end by: 06:00}\n"), Repeat)


def test_a_when_has_two_branches_of_which_the_second_may_be_missing() -> None:
    both = step("  - when: last leg failed\n    then: [wait: 1 s]\n    else: [wait: 2 s, wait: 3 s]\n")
    one = step("  - {when: last leg failed, then: [wait: 1 s]}\n")
    assert isinstance(both, When)
    assert isinstance(one, When)
    assert (len(both.then), len(both.otherwise), len(one.otherwise)) == (1, 2, 0)


def test_the_steps_that_take_no_time_are_read() -> None:
    body = "  - {count: trays, by: 2}\n  - notify: Half {{of it}}.\n  - {end: failed, because: no time}\n"
    count, notify, end = texts.mission(f"steps:\n{body}").steps
    assert isinstance(count, Count)
    assert isinstance(notify, Notify)
    assert isinstance(end, End)
    assert (count.name, count.by, notify.text) == ("trays", 2, "Half {of it}.")
    assert (end.completed, end.because) == (False, "no time")


# --- routines -----------------------------------------------------------------------------------------------------


def test_a_routine_is_written_out_with_its_arguments_and_keeps_its_marks() -> None:
    found = step("  - run: hand over\n    with: {room: laboratory}\n", ROUTINE)
    assert isinstance(found, Run)
    go, notify = found.steps
    assert isinstance(go, Go)
    assert isinstance(notify, Notify)
    assert (found.title, go.place.name, notify.text) == (
        "hand over (laboratory)",
        "laboratory",
        "The cart is at laboratory.",
    )
    assert (go.mark.line, found.mark.line) == (9, 12)


def test_a_mistake_in_a_routine_is_told_once_however_often_it_is_run() -> None:
    body = ROUTINE.replace("go: room", "go: romo") + "steps:\n" + "  - {run: hand over, with: {room: laboratory}}\n" * 3
    assert problem(body) == 'There is no place called "romo".'


def test_routines_that_nest_too_deep_are_a_mistake_and_no_crash() -> None:
    chain = "".join(f"  r{number}: {{steps: [run: r{number + 1}]}}\n" for number in range(3_000))
    with pytest.raises(LanguageError) as caught:
        texts.mission(f"routines:\n{chain}  r3000: {{steps: [wait: 1 s]}}\nsteps: [run: r0]\n")
    assert "nested over 40 deep" in caught.value.diagnostics[0].sentence


def test_routines_shared_by_many_take_no_time_of_their_own() -> None:
    doubling = "".join(f"  r{n}: {{steps: [run: r{n + 1}, run: r{n + 1}]}}\n" for n in range(30))
    body = f"routines:\n{doubling}  r30: {{steps: [wait: 1 s]}}\nsteps: [run: r0]\n"
    assert problem(body) == "With its routines written out, this mission has over 200,000 steps."


# --- the rest of the file -----------------------------------------------------------------------------------------


def test_everything_is_read_into_one_mission(whole: Mission) -> None:
    assert whole.prove == Prove(0.95, 0.9)
    assert whole.silenced == ("unused-rule",)
    assert [rule.name for rule in whole.rules] == ["default", "hasty", "patient"]
    assert [(order.name, order.then) for order in whole.orders] == [
        ("low battery", Then.CARRY_ON),
        ("enough", Then.END),
        ("anew", Then.REPEAT_STEP),
    ]
    assert whole.orders[2].condition.expression.kind is Kind.NOT
    assert [Path(source.path).name for source in whole.sources] == ["round.yaml", "shared.yaml"]


def test_steps_of_a_shared_routine_keep_the_file_they_stand_in(tmp_path: Path) -> None:
    (tmp_path / "shared.yaml").write_text(everything.SHARED)
    body = "include: [shared.yaml]\nsteps:\n  - run: knock\n    with: {room: laboratory, who: the cart}\n"
    mission = read_mission(texts.HEAD + body, str(tmp_path / "round.yaml"), texts.site(), texts.ROBOT)
    (run,) = mission.steps
    assert isinstance(run, Run)
    assert [Path(inner.mark.file).name for inner in run.steps] == ["shared.yaml", "shared.yaml"]


def included(tmp_path: Path, files: dict[str, str], include: str) -> list[tuple[str, int, str]]:
    """What is wrong with a mission that includes these files: file, line, sentence."""
    for name, text in files.items():
        (tmp_path / name).write_text(text)
    body = f"{texts.HEAD}include: [{include}]\nretry rules: {{mine: {{tries: 1}}}}\n{texts.STEPS}"
    try:
        read_mission(body, str(tmp_path / "round.yaml"), texts.site(), texts.ROBOT)
    except LanguageError as error:
        return [(Path(found.mark.file).name, found.mark.line, found.sentence) for found in error.diagnostics]
    return []


def test_a_file_may_be_included_by_several_ways(tmp_path: Path) -> None:
    files = {
        "a.yaml": "shared: A\ninclude: [c.yaml]\n",
        "b.yaml": "shared: B\ninclude: [./c.yaml]\n",
        "c.yaml": "shared: C\nretry rules: {yours: {tries: 2}}\n",
    }
    assert included(tmp_path, files, "a.yaml, b.yaml") == []


def test_files_that_include_each_other_are_told_where_the_circle_closes(tmp_path: Path) -> None:
    files = {"a.yaml": "shared: A\ninclude: [b.yaml]\n", "b.yaml": "shared: B\ninclude: [a.yaml]\n"}
    assert included(tmp_path, files, "a.yaml") == [("b.yaml", 2, "A file cannot include itself.")]


def test_two_rules_of_one_name_are_a_mistake_wherever_they_stand(tmp_path: Path) -> None:
    files = {"a.yaml": "shared: A\nretry rules: {mine: {tries: 2}}\n"}
    assert included(tmp_path, files, "a.yaml") == [("round.yaml", 6, 'There is a retry rule called "mine" already.')]


def test_what_is_wrong_in_a_shared_file_is_told_there(tmp_path: Path) -> None:
    files = {"a.yaml": "shared: A\nroutines:\n  x: {steps: [go: nowhere]}\n"}
    assert included(tmp_path, files, "a.yaml") == [("a.yaml", 3, 'There is no place called "nowhere".')]


def test_a_site_may_name_its_time_zone() -> None:
    assert texts.site("time zone: Europe/Berlin\n" + texts.SITE).time_zone == "Europe/Berlin"
    with pytest.raises(LanguageError) as caught:
        texts.site("time zone: Europe/Berln\n" + texts.SITE)
    assert texts.only(caught.value).help == 'The nearest time zone is "Europe/Berlin".'
