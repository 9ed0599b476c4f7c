"""The steps with steps in them: repeat and when."""

from __future__ import annotations

from dataclasses import replace

from runner.language.diagnostics import nearest, quoted
from runner.language.expressions import Condition
from runner.language.fields import Fields, Keys, mapping
from runner.language.mission import Mark, Overrun, Repeat, Step, When
from runner.language.nodes import Mapping, Node
from runner.language.quantities import DURATION, Amount, Count
from runner.language.scope import Scope, read_condition

REPEAT_FOR = Amount("The time to repeat for", DURATION, "1 s", "168 h")
EVERY = Amount("The time from lap to lap", DURATION, "1 s", "24 h")
TIMES = Count("The number of laps", 1, 100_000)

REPEAT_KEYS: Keys = {"repeat": "{times: 3, steps: [go: ward east]}"}
REPEAT_BODY_KEYS: Keys = {
    "times": "3",
    "for": "2 h",
    "until": "05:30",
    "every": "30 min",
    "if a lap overruns": "next interval",
    "steps": "[go: ward east]",
}
WHEN_KEYS: Keys = {"when": "battery < 20 %", "then": "[go: charging bay]", "else": "[go: ward east]"}
BOUNDS = ("times", "for", "until")
OVERRUN_WORDS = {overrun.value: overrun for overrun in Overrun}


def read_repeat(scope: Scope, node: Mapping) -> Step | None:
    page = scope.page
    mark = Fields(page, node, "the step repeat", REPEAT_KEYS).pair_mark("repeat")
    body = mapping(page, node.pairs["repeat"][1], "repeat", REPEAT_KEYS["repeat"])
    if body is None:
        return None
    fields = Fields(page, body, "the step repeat", REPEAT_BODY_KEYS)
    steps, inside = fields.need("steps"), replace(scope, in_loop=True)
    laps = () if steps is None else scope.read_steps(inside, steps, "steps")
    return _bounded(inside, fields, mark, laps)


def _bounded(scope: Scope, fields: Fields, mark: Mark, steps: tuple[Step, ...]) -> Repeat | None:
    """The loop with its bound, or None after a report of several, or of none where one is needed."""
    pairs = fields.mapping.pairs
    bounds = [key for key in pairs if key in BOUNDS]
    if len(bounds) > 1:
        sentence = f"A loop has one bound, but this has {' and '.join(bounds)}."
        fields.page.report(pairs[bounds[1]][0], sentence, "Keep one of them.")
        return None
    if not bounds and "every" not in pairs and not scope.endless:
        help_text = "Add times: 3, or for: 2 h, or until: 05:30, or every: 30 min, or give the mission an end by."
        fields.page.report(mark, "This loop does not say when it ends.", help_text)
        return None
    return Repeat(
        mark,
        times=fields.count("times", TIMES) if "times" in bounds else None,
        seconds=fields.number("for", REPEAT_FOR) if "for" in bounds else None,
        until=_read_until(scope, fields),
        steps=steps,
        every=fields.number("every", EVERY) if "every" in pairs else None,
        overrun=_read_overrun(fields),
    )


def _read_until(scope: Scope, fields: Fields) -> Condition | None:
    node = fields.get("until")
    return None if node is None else read_condition(scope, node, REPEAT_BODY_KEYS["until"], until=True)


def _read_overrun(fields: Fields) -> Overrun:
    key = "if a lap overruns"
    node = fields.get(key)
    text = None if node is None else fields.page.text(node, "what a late lap does", REPEAT_BODY_KEYS[key])
    if node is None or text is None:
        return Overrun.AT_ONCE
    if "every" not in fields.mapping.pairs:
        sentence = "Only laps at an interval can overrun it."
        fields.page.report(fields.mapping.pairs[key][0], sentence, "Add for example every: 30 min")
    elif text not in OVERRUN_WORDS:
        help_text = nearest(text, OVERRUN_WORDS, "wording")
        fields.page.report(node, f"{quoted(text)} does not say when a late lap begins.", help_text)
    return OVERRUN_WORDS.get(text, Overrun.AT_ONCE)


def read_when(scope: Scope, node: Mapping) -> Step:
    fields = Fields(scope.page, node, "the step when", WHEN_KEYS)
    condition = read_condition(scope, node.pairs["when"][1], WHEN_KEYS["when"])
    then, otherwise = fields.need("then"), fields.get("else")
    return When(
        fields.pair_mark("when"), condition, _read_branch(scope, then, "then"), _read_branch(scope, otherwise, "else")
    )


def _read_branch(scope: Scope, node: Node | None, what: str) -> tuple[Step, ...]:
    return () if node is None else scope.read_steps(scope, node, what)
