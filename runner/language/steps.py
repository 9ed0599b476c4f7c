"""The steps of a mission: go, visit, wait and repeat, each in a function and a table of its keys."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from runner.language.diagnostics import nearest, quoted
from runner.language.expressions import Condition, Expression, Kind, Operator, Quantity
from runner.language.fields import Fields, Keys, amount, items, mapping
from runner.language.mission import Go, Mark, Otherwise, Repeat, RetryRule, Step, Visit, Wait
from runner.language.nodes import Mapping, Node, Scalar, Sequence
from runner.language.pages import Page
from runner.language.quantities import DURATION, Amount, Count, parse_clock
from runner.language.rules import DEFAULT_RULE
from runner.site.values import Place, Pose

WITHIN = Amount("The time for a leg", DURATION, "1 s", "24 h")
WAIT = Amount("A wait", DURATION, "1 s", "24 h")
REPEAT_FOR = Amount("The time to repeat for", DURATION, "1 s", "168 h")
TIMES = Count("The number of laps", 1, 100_000)

GO_KEYS: Keys = {"go": "ward east", "rule": "patient", "within": "4 min", "otherwise": "skip"}
VISIT_KEYS: Keys = {"visit": "[ward east, laboratory]", "rule": "patient", "within": "4 min", "otherwise": "skip"}
WAIT_KEYS: Keys = {"wait": "2 min"}
REPEAT_KEYS: Keys = {"repeat": "{times: 3, steps: [go: ward east]}"}
REPEAT_BODY_KEYS: Keys = {"times": "3", "for": "2 h", "until": "05:30", "steps": "[go: ward east]"}
BOUNDS = ("times", "for", "until")

NOWHERE = Place("", Pose(0.0, 0.0, 0.0))
"""Stands in for a place that was reported, until reading ends."""


@dataclass(frozen=True, slots=True)
class Scope:
    """What the steps of a mission may name. `places` is None where the site could not be read."""

    page: Page
    places: dict[str, Place] | None
    rules: dict[str, RetryRule]


def read_steps(scope: Scope, node: Node, what: str = "steps") -> tuple[Step, ...]:
    """A list of steps; those at fault are left out after a report."""
    found = (_read_step(scope, item) for item in items(scope.page, node, what, "- go: ward east"))
    return tuple(step for step in found if step is not None)


def read_place(scope: Scope, node: Node) -> Place:
    """The place a scalar names."""
    text = scope.page.text(node, "a place", "ward east")
    if text is None or scope.places is None:
        return NOWHERE
    place = scope.places.get(text)
    if place is not None:
        return place
    scope.page.report(node, f"There is no place called {quoted(text)}.", nearest(text, scope.places, "place"))
    return NOWHERE


def _read_step(scope: Scope, node: Node) -> Step | None:
    if not isinstance(node, Mapping):
        _report_no_step(scope.page, node)
        return None
    verbs = [key for key in node.pairs if key in _VERBS]
    if len(verbs) == 1:
        return _VERBS[verbs[0]](scope, node)
    if verbs:
        second = node.pairs[verbs[1]][0]
        sentence = f"A step does one thing, but {verbs[0]} and {verbs[1]} stand in one."
        scope.page.report(second, sentence, f"Begin {verbs[1]} with a dash of its own.")
    else:
        _report_unknown_verb(scope.page, node)
    return None


def _report_no_step(page: Page, node: Node) -> None:
    if isinstance(node, Scalar) and node.text in _VERBS:
        page.report(node, f"{quoted(node.text)} alone is not a step.", f"Write for example {_EXAMPLES[node.text]}.")
    else:
        page.report(node, "This is not a step.", f"Write for example {_EXAMPLES['go']}.")


def _report_unknown_verb(page: Page, node: Mapping) -> None:
    key = next((key for word, (key, _) in node.pairs.items() if word not in GO_KEYS), None)
    if key is None:
        page.report(node, "This step does not say what to do.", f"Begin it with {_LISTED_VERBS}.")
    else:
        help_text = nearest(key.text, _VERBS, "step")
        page.report(key, f"There is no step called {quoted(key.text)}.", help_text)


def _read_go(scope: Scope, node: Mapping) -> Step:
    fields = Fields(scope.page, node, "the step go", GO_KEYS)
    place = read_place(scope, node.pairs["go"][1])
    return Go(fields.pair_mark("go"), place, *_leg_options(scope, fields))


def _read_visit(scope: Scope, node: Mapping) -> Step:
    page = scope.page
    fields = Fields(page, node, "the step visit", VISIT_KEYS)
    listed = items(page, node.pairs["visit"][1], "places to visit", VISIT_KEYS["visit"])
    places = tuple((page.mark(item), read_place(scope, item)) for item in listed)
    return Visit(fields.pair_mark("visit"), places, *_leg_options(scope, fields))


def _leg_options(scope: Scope, fields: Fields) -> tuple[RetryRule, float | None, Otherwise | tuple[Step, ...] | None]:
    """Rule, time limit and what follows a failed leg."""
    limit = fields.get("within")
    return (
        _read_rule_name(scope, fields.get("rule")),
        None if limit is None else amount(scope.page, limit, WITHIN, GO_KEYS["within"]),
        _read_otherwise(scope, fields.get("otherwise")),
    )


def _read_rule_name(scope: Scope, node: Node | None) -> RetryRule:
    text = DEFAULT_RULE.name if node is None else scope.page.text(node, "a retry rule", "patient")
    rule = DEFAULT_RULE if text is None else scope.rules.get(text)
    if rule is not None:
        return rule
    if node is not None and text is not None:
        help_text = nearest(text, scope.rules, "retry rule")
        scope.page.report(node, f"There is no retry rule called {quoted(text)}.", help_text)
    return DEFAULT_RULE


def _read_otherwise(scope: Scope, node: Node | None) -> Otherwise | tuple[Step, ...] | None:
    if node is None:
        return None
    if isinstance(node, Sequence):
        return read_steps(scope, node, "otherwise")
    help_text = "Write skip, end, or a list of steps, each with a dash."
    if isinstance(node, Mapping):
        scope.page.report(node, "What follows a failed leg is a word or a list of steps.", help_text)
        return None
    text = scope.page.text(node, "what follows a failed leg", GO_KEYS["otherwise"])
    word = None if text is None else _OTHERWISE_WORDS.get(text)
    if text is not None and word is None:
        scope.page.report(node, f"{quoted(text)} does not say what follows a failed leg.", help_text)
    return word


def _read_wait(scope: Scope, node: Mapping) -> Step:
    fields = Fields(scope.page, node, "the step wait", WAIT_KEYS)
    return Wait(fields.pair_mark("wait"), fields.number("wait", WAIT))


def _read_repeat(scope: Scope, node: Mapping) -> Step | None:
    page = scope.page
    mark = Fields(page, node, "the step repeat", REPEAT_KEYS).pair_mark("repeat")
    body = mapping(page, node.pairs["repeat"][1], "repeat", REPEAT_KEYS["repeat"])
    if body is None:
        return None
    fields = Fields(page, body, "the step repeat", REPEAT_BODY_KEYS)
    steps = fields.need("steps")
    laps = () if steps is None else read_steps(scope, steps)
    return _bounded(fields, mark, laps)


def _bounded(fields: Fields, mark: Mark, steps: tuple[Step, ...]) -> Repeat | None:
    """The loop with its one bound, or None after a report of none or several."""
    bounds = [key for key in fields.mapping.pairs if key in BOUNDS]
    if len(bounds) != 1:
        if bounds:
            sentence = f"A loop has one bound, but this has {' and '.join(bounds)}."
            fields.page.report(fields.mapping.pairs[bounds[1]][0], sentence, "Keep one of them.")
        else:
            help_text = "Add times: 3, or for: 2 h, or until: 05:30."
            fields.page.report(mark, "This loop does not say when it ends.", help_text)
        return None
    bound = bounds[0]
    return Repeat(
        mark,
        times=fields.count("times", TIMES) if bound == "times" else None,
        seconds=fields.number("for", REPEAT_FOR) if bound == "for" else None,
        until=_clock_reached(fields) if bound == "until" else None,
        steps=steps,
    )


def _clock_reached(fields: Fields) -> Condition:
    clock = fields.phrase("until", parse_clock, 0.0)
    expression = Expression(Kind.COMPARE, quantity=Quantity.CLOCK, operator=Operator.AT_LEAST, value=clock)
    return Condition(expression, text=f"{int(clock) // 3600:02d}:{int(clock) // 60 % 60:02d}")


_VERBS: dict[str, Callable[[Scope, Mapping], Step | None]] = {
    "go": _read_go,
    "visit": _read_visit,
    "wait": _read_wait,
    "repeat": _read_repeat,
}
_EXAMPLES = {
    "go": "go: ward east",
    "visit": "visit: [ward east, laboratory]",
    "wait": "wait: 2 min",
    "repeat": "repeat: {times: 3, steps: [go: ward east]}",
}
_OTHERWISE_WORDS = {word.value: word for word in Otherwise}
_LISTED_VERBS = "go, visit, wait or repeat"
