"""The steps of a mission: which there are, and the readers of those that have no steps inside and do not drive."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from runner.language.diagnostics import nearest, quoted
from runner.language.expression_reader import RESERVED
from runner.language.fields import Fields, Keys, amount, items, mapping, name
from runner.language.legs import read_charge, read_go, read_otherwise, read_visit
from runner.language.mission import Ask, End, Notify, Step, Wait
from runner.language.mission import Count as CountStep
from runner.language.nested import read_repeat, read_when
from runner.language.nodes import Mapping, Node, Scalar
from runner.language.pages import Page
from runner.language.quantities import DURATION, Amount, Count, PhraseError, parse_clock
from runner.language.routines import NESTING_MOST, read_run, report_nesting
from runner.language.scope import Scope, read_condition, read_text

WAIT = Amount("A wait", DURATION, "1 s", "24 h")
ASK_UP_TO = Amount("The time for an answer", DURATION, "1 s", "24 h")
COUNT_BY = Count("What is counted at once", 1, 1000)
ANSWERS_MOST = 8

WAIT_KEYS: Keys = {"wait": "2 min"}
WAIT_BODY_KEYS: Keys = {"until": "battery >= 50 %", "up to": "10 min", "otherwise": "skip"}
ASK_KEYS: Keys = {"ask": "Tray taken?", "answers": "[yes, no]", "up to": "90 s", "if silent": "no"}
COUNT_KEYS: Keys = {"count": "trays", "by": "2"}
NOTIFY_KEYS: Keys = {"notify": "The round is done."}
END_KEYS: Keys = {"end": "completed", "because": "nothing is left to do"}
ENDS = {"completed": True, "failed": False}


def read_steps(scope: Scope, node: Node, what: str = "steps") -> tuple[Step, ...]:
    """A list of steps; those at fault are left out after a report."""
    depth = scope.depth + 1
    if depth > NESTING_MOST:
        report_nesting(scope.page, node)
        return ()
    scope.ledger.deepest = max(scope.ledger.deepest, depth)
    inner = replace(scope, depth=depth)
    found = [_read_step(inner, item) for item in items(scope.page, node, what, "- go: ward east")]
    scope.ledger.steps += len(found)
    return tuple(step for step in found if step is not None)


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
    key = next((key for word, (key, _) in node.pairs.items() if word not in _OPTIONS), None)
    if key is None:
        page.report(node, "This step does not say what to do.", f"Begin it with {_LISTED_VERBS}.")
    else:
        help_text = nearest(key.text, _VERBS, "step")
        page.report(key, f"There is no step called {quoted(key.text)}.", help_text)


# --- waits and questions ------------------------------------------------------------------------------------------


def _read_wait(scope: Scope, node: Mapping) -> Step | None:
    fields = Fields(scope.page, node, "the step wait", WAIT_KEYS)
    mark, value = fields.pair_mark("wait"), node.pairs["wait"][1]
    if isinstance(value, Mapping):
        return _read_wait_until(scope, fields, value)
    return Wait(mark, scope.page.phrase(value, _parse_wait, WAIT.least, "a time", WAIT_KEYS["wait"]))


def _parse_wait(text: str) -> float:
    try:
        return WAIT.read(text)
    except PhraseError as error:
        try:
            parse_clock(text)
        except PhraseError:
            raise error from None
        help_text = f"Write wait: {{until: {text}}}"
        raise PhraseError(0, len(text), "A wait lasts a time; this is a clock time.", help_text) from None


def _read_wait_until(scope: Scope, outer: Fields, node: Mapping) -> Step | None:
    page = scope.page
    body = mapping(page, node, "wait", "{until: battery >= 50 %, up to: 10 min}")
    if body is None:
        return None
    fields = Fields(page, body, "the step wait", WAIT_BODY_KEYS)
    until, up_to, otherwise = fields.need("until"), fields.get("up to"), fields.get("otherwise")
    if otherwise is not None and up_to is None:
        sentence = '"otherwise" follows when a time is over, but there is none.'
        page.report(node.pairs["otherwise"][0], sentence, "Add for example up to: 10 min")
    return Wait(
        outer.pair_mark("wait"),
        None,
        read_condition(scope, until, WAIT_BODY_KEYS["until"], until=True, lasting=True),
        None if up_to is None else amount(page, up_to, WAIT, WAIT_BODY_KEYS["up to"]),
        read_otherwise(scope, otherwise, "a wait in vain"),
    )


def _read_ask(scope: Scope, node: Mapping) -> Step:
    fields = Fields(scope.page, node, "the step ask", ASK_KEYS)
    answers = _read_answers(scope, fields)
    return Ask(
        fields.pair_mark("ask"),
        read_text(scope, node.pairs["ask"][1], "a question", '"Tray taken?"'),
        answers,
        fields.number("up to", ASK_UP_TO),
        _read_if_silent(fields, answers),
    )


def _read_answers(scope: Scope, fields: Fields) -> tuple[str, ...]:
    node = fields.need("answers")
    listed = [] if node is None else items(fields.page, node, "answers", ASK_KEYS["answers"])
    if node is not None and len(listed) > ANSWERS_MOST:
        fields.page.report(
            node, f"{len(listed)} answers are more than a person takes in.", f"Offer {ANSWERS_MOST} at most."
        )
    found: list[str] = []
    for item in listed:
        text = name(fields.page, item, "yes")
        if text.casefold() in (answer.casefold() for answer in found):
            fields.page.report(item, f"The answer {quoted(text)} is offered twice.", "Keep one of the two.")
        found.append(text)
    scope.ledger.offered.update(found)
    return tuple(found)


def _read_if_silent(fields: Fields, answers: tuple[str, ...]) -> str:
    node = fields.need("if silent")
    text = None if node is None else fields.page.text(node, "an answer", ASK_KEYS["if silent"])
    if node is None or text is None:
        return ""
    if answers and text not in answers:
        help_text = nearest(text, answers, "answer")
        fields.page.report(node, f"{quoted(text)} is not among the answers.", help_text)
    return text


# --- steps that take no time --------------------------------------------------------------------------------------


def _read_count(scope: Scope, node: Mapping) -> Step:
    page = scope.page
    fields = Fields(page, node, "the step count", COUNT_KEYS)
    counted = fields.name("count")
    if set(counted.split()) & set(RESERVED):
        page.report(node.pairs["count"][1], f"A count cannot be called {quoted(counted)}.", _COUNT_HELP)
    elif counted and not all(character.isalnum() or character in " -_" for character in counted):
        page.report(node.pairs["count"][1], "The name of a count consists of letters.", _COUNT_HELP)
    elif counted[:1].isdigit():
        page.report(node.pairs["count"][1], "The name of a count begins with a letter.", _COUNT_HELP)
    scope.ledger.counted.add(" ".join(counted.split()))
    by = 1 if fields.get("by") is None else fields.count("by", COUNT_BY)
    return CountStep(fields.pair_mark("count"), " ".join(counted.split()), by)


def _read_notify(scope: Scope, node: Mapping) -> Step:
    fields = Fields(scope.page, node, "the step notify", NOTIFY_KEYS)
    return Notify(fields.pair_mark("notify"), read_text(scope, node.pairs["notify"][1], "a message", _MESSAGE))


def _read_end(scope: Scope, node: Mapping) -> Step:
    page = scope.page
    fields = Fields(page, node, "the step end", END_KEYS)
    value, because = node.pairs["end"][1], fields.get("because")
    text = page.text(value, "completed or failed", END_KEYS["end"])
    if text is not None and text not in ENDS:
        page.report(value, f"A mission does not end {quoted(text)}.", "Write end: completed or end: failed")
    reason = "" if because is None else read_text(scope, because, "a reason", END_KEYS["because"])
    return End(fields.pair_mark("end"), ENDS.get(text or "", True), reason)


_MESSAGE = '"The round is done."'
_COUNT_HELP = "Write a word or two, for example trays."

_VERBS: dict[str, Callable[[Scope, Mapping], Step | None]] = {
    "go": read_go,
    "visit": read_visit,
    "wait": _read_wait,
    "ask": _read_ask,
    "charge": read_charge,
    "repeat": read_repeat,
    "when": read_when,
    "run": read_run,
    "count": _read_count,
    "notify": _read_notify,
    "end": _read_end,
}
_EXAMPLES = {
    "go": "go: ward east",
    "visit": "visit: [ward east, laboratory]",
    "wait": "wait: 2 min",
    "ask": 'ask: "Tray taken?"',
    "charge": "charge: {at: charging bay, until: battery >= 70 %}",
    "repeat": "repeat: {times: 3, steps: [go: ward east]}",
    "when": "when: battery < 20 %",
    "run": "run: hand over",
    "count": "count: trays",
    "notify": f"notify: {_MESSAGE}",
    "end": "end: completed",
}
_OPTIONS = {
    "rule",
    "within",
    "otherwise",
    "order",
    "each",
    "answers",
    "up to",
    "if silent",
    "then",
    "else",
    "with",
    "by",
}
"""Keys that belong to a step, but do not say which."""

_LISTED_VERBS = f"{', '.join(list(_VERBS)[:-1])} or {list(_VERBS)[-1]}"
