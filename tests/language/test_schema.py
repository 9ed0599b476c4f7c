"""The JSON Schema takes what the reader takes, and refuses the slips that it can know of."""

from __future__ import annotations

from pathlib import Path

import pytest
import yaml
from jsonschema import Draft202012Validator

from runner.cli.new import ROUND
from runner.language.examples import example_names, find_example
from runner.language.schema import mission_schema
from tests.language import everything, texts
from tests.language.test_language_reference import EXAMPLES, SHARED, whole

SCHEMA = mission_schema()
VALIDATOR = Draft202012Validator(SCHEMA)
MISSIONS = {
    **{name: Path(str(find_example(name))).read_text() for name in example_names()},
    "everything": everything.MISSION,
    "new": ROUND,
    **{f"reference {number}": whole(text) for number, text in enumerate(EXAMPLES) if text != SHARED},
}


def test_the_schema_is_a_schema() -> None:
    Draft202012Validator.check_schema(SCHEMA)


@pytest.mark.parametrize("name", MISSIONS)
def test_a_mission_that_can_be_read_fits_the_schema(name: str) -> None:
    faults = [error.message for error in VALIDATOR.iter_errors(yaml.safe_load(MISSIONS[name]))]
    assert faults == []


@pytest.mark.parametrize(
    "body",
    [
        "steps: []",
        "steps: [goto: ward east]",
        "steps: [{go: ward east, whitin: 4 min}]",
        "steps: [{go: ward east, within: 4}]",
        "steps: [{go: ward east, otherwise: stop}]",
        "steps: [{go: {x: 3 m, y: 4 m}}]",
        "steps: [visit: ward east]",
        "steps: [{visit: [ward east], order: fastest}]",
        "steps: [wait: 5]",
        "steps: [wait: {up to: 5 min}]",
        "steps: [{ask: Well, answers: [yes], up to: 1 min}]",
        "steps: [charge: {at: ward east}]",
        "steps: [repeat: {times: often, steps: [wait: 5 s]}]",
        "steps: [repeat: {times: 3}]",
        "steps: [when: proven]",
        "steps: [{end: badly}]",
        "steps: [wait: 5 s]\nprove: {legs arrive: 95 %}",
        "steps: [wait: 5 s]\nlimits: {speed: 5 mph}",
        "steps: [wait: 5 s]\nretry rules: {patient: {recover: [wriggle]}}",
        "steps: [wait: 5 s]\nroutines: {hand over: {given: [room]}}",
        "steps: [wait: 5 s]\nstanding orders: [{name: low, when: proven, do: [wait: 5 s], then: continue}]",
        "steps: [wait: 5 s]\nstan: ward east",
    ],
)
def test_a_slip_does_not_fit(body: str) -> None:
    assert list(VALIDATOR.iter_errors(yaml.safe_load(texts.HEAD + body)))
