"""LANGUAGE.md is the reference: every example in it is read, compiled and has no fault in its table."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

import runner.language
from runner.language import legs, mission_file, nested, orders, routines, rules, steps
from runner.language.fields import Keys
from runner.language.includes import SHARED_KEYS
from runner.language.reader import read_mission, read_site
from runner.machine.compiler import compile_mission
from runner.machine.table_checks import check_table
from tests.language import texts

PAGE = (Path(runner.language.__file__).parent / "LANGUAGE.md").read_text()
EXAMPLES = re.findall(r"```yaml\n(.*?)```", PAGE, flags=re.DOTALL)
SHARED = next(text for text in EXAMPLES if text.startswith("shared:"))
NAMES = ("ward east", "ward west", "laboratory", "pharmacy", "charging bay")
SITE = "site: Test floor\nfloor: 20 m x 15 m\nplaces:\n" + "".join(
    f"  {name}: {{at: [{2 + 3 * number} m, 5 m], facing: east}}\n" for number, name in enumerate(NAMES)
)
CONTEXT = {
    "retry rules": "retry rules: {patient: {tries: 3}}\n",
    "limits": "limits: {end by: 06:00}\n",
    "prove": "prove: {legs arrive: 95 %, confidence: 90 %}\n",
    "standing orders": """\
standing orders:
  - name: a question
    when: battery < 1 %
    do:
      - ask: "Well?"
        answers: [yes, now or never]
        up to: 1 min
        if silent: yes
      - count: trays
""",
}
"""What an example of steps may refer to; a key that an example writes itself is left out."""


def whole(example: str) -> str:
    """The mission of which an example is a part."""
    if example.startswith("mission:"):
        return example
    body = "steps:\n" + example if example.startswith("- ") else example
    body += "" if re.search("^steps:", body, re.MULTILINE) else "steps: [go: ward east]\n"
    context = [text for key, text in CONTEXT.items() if not re.search(f"^{key}:", body, re.MULTILINE)]
    return texts.HEAD + "".join(context) + body


@pytest.mark.parametrize("example", [text for text in EXAMPLES if text != SHARED], ids=lambda text: text[:24])
def test_every_example_is_read_and_has_no_fault(example: str, tmp_path: Path) -> None:
    (tmp_path / "shared.yaml").write_text(SHARED)
    site = read_site(SITE, "floor.yaml")
    mission = read_mission(whole(example), str(tmp_path / "round.yaml"), site, texts.ROBOT)
    assert check_table(compile_mission(mission)) == []


TABLES: list[Keys] = [
    mission_file.MISSION_KEYS,
    mission_file.LIMIT_KEYS,
    SHARED_KEYS,
    rules.RULE_KEYS,
    orders.ORDER_KEYS,
    orders.PROVE_KEYS,
    routines.ROUTINE_KEYS,
    routines.RUN_KEYS,
    legs.GO_KEYS,
    legs.VISIT_KEYS,
    legs.CHARGE_BODY_KEYS,
    nested.REPEAT_BODY_KEYS,
    nested.WHEN_KEYS,
    steps.WAIT_BODY_KEYS,
    steps.ASK_KEYS,
    steps.COUNT_KEYS,
    steps.END_KEYS,
]


@pytest.mark.parametrize("key", sorted({key for table in TABLES for key in table}))
def test_every_key_that_is_read_is_in_an_example(key: str) -> None:
    assert any(re.search(rf"(^|[\s{{,-]){re.escape(key)}:", example) for example in EXAMPLES)
