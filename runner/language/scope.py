"""What the steps of a mission may name, and what they did name: places, rules, routines, parameters, counts, answers.

A `Scope` is handed down through the readers of steps. It changes where a name may mean something else: inside a loop,
inside a routine, in another file.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from runner.language.diagnostics import nearest, quoted
from runner.language.expression_reader import Named, Parsed, parse_condition, parse_until
from runner.language.expressions import Condition, Expression, Kind
from runner.language.mission import Mark, RetryRule, Step
from runner.language.nodes import Node
from runner.language.pages import Page
from runner.language.rules import DEFAULT_RULE
from runner.site.values import Place, Pose, Site

if TYPE_CHECKING:
    from runner.language.routines import Library

TEXT_MOST = 500
"""Characters of a question or a message."""

NOWHERE = Place("", Pose(0.0, 0.0, 0.0))
"""Stands in for a place that was reported, until reading ends."""

NEVER = Condition(Expression(Kind.OR))
"""Stands in for a condition that was reported."""

_BRACES = re.compile(r"\{\{|\}\}|\{([^{}]*)\}|[{}]")

ReadSteps = Callable[["Scope", Node, str], tuple[Step, ...]]


@dataclass(slots=True)
class Ledger:
    """What all steps of a mission together count, offer as answers, and ask of both; and how many steps there are.

    A condition may ask for a count or an answer that is written further down, so that is checked at the end.
    """

    steps: int = 0
    deepest: int = 0
    counted: set[str] = field(default_factory=set)
    offered: set[str] = field(default_factory=set)
    asked: dict[Mark, tuple[Page, Named, str]] = field(default_factory=dict)

    def close(self) -> None:
        """Report conditions on counts that nothing counts, and on answers that no question offers."""
        for mark, (page, what, name) in self.asked.items():
            if what is Named.COUNT and name not in self.counted:
                help_text = nearest(name, self.counted, "count") or f"Add a step to the mission: count: {name}"
                page.report(mark, f"Nothing counts {quoted(name)}.", help_text)
            elif what is Named.ANSWER and name not in self.offered:
                help_text = nearest(name, self.offered, "answer") or "Add a step ask with this among its answers."
                page.report(mark, f"No question offers the answer {quoted(name)}.", help_text)


@dataclass(frozen=True, slots=True)
class Call:
    """The routine being read: what stands for each of its parameters.

    In `draft`, when the routine is read for itself and every parameter stands for nothing yet, `as_places` collects
    those that are used as places.
    """

    arguments: Mapping[str, str]
    draft: bool = False
    as_places: set[str] = field(default_factory=set)


@dataclass(frozen=True, slots=True)
class Scope:
    """`places` and `site` are None where the site could not be read. `endless` says that the mission ends by a clock
    time, so a loop needs no bound; `proves`, that it has something to prove. `depth` counts the lists of steps around,
    in routines too."""

    page: Page
    site: Site | None
    places: Mapping[str, Place] | None
    rules: Mapping[str, RetryRule]
    library: Library
    ledger: Ledger
    read_steps: ReadSteps
    endless: bool = False
    proves: bool = False
    in_loop: bool = False
    depth: int = 0
    call: Call | None = None


def read_place(scope: Scope, node: Node) -> Place:
    """The place a scalar names."""
    text = scope.page.text(node, "a place", "ward east")
    return NOWHERE if text is None else find_place(scope, text) or _no_place(scope, node, text)


def find_place(scope: Scope, text: str) -> Place | None:
    """The place of that name, or what stands for the parameter of that name; None if there is neither."""
    call, places = scope.call, scope.places or {}
    if call is not None and text in call.arguments:
        if call.draft:
            call.as_places.add(text)
        return places.get(call.arguments[text], NOWHERE)  # an argument that is no place was reported where it is given
    return NOWHERE if scope.places is None else places.get(text)


def _no_place(scope: Scope, node: Node, text: str) -> Place:
    known = [*(scope.call.arguments if scope.call else ()), *(scope.places or ())]
    scope.page.report(node, f"There is no place called {quoted(text)}.", nearest(text, known, "place"))
    return NOWHERE


def read_rule_name(scope: Scope, node: Node | None) -> RetryRule:
    """The retry rule a scalar names; the default one where nothing is written."""
    text = DEFAULT_RULE.name if node is None else scope.page.text(node, "a retry rule", "patient")
    rule = DEFAULT_RULE if text is None else scope.rules.get(text)
    if rule is not None:
        return rule
    if node is not None and text is not None:
        help_text = nearest(text, scope.rules, "retry rule")
        scope.page.report(node, f"There is no retry rule called {quoted(text)}.", help_text)
    return DEFAULT_RULE


def read_text(scope: Scope, node: Node | None, what: str, example: str) -> str:
    """A text for people, with what stands for the {parameters} in it."""
    text = None if node is None else scope.page.text(node, what, example)
    if node is None or text is None:
        return ""
    if len(text) > TEXT_MOST:
        scope.page.report(node, f"This is too long for {what}: {len(text)} characters.", f"Write at most {TEXT_MOST}.")
        return ""
    return text if "{" not in text and "}" not in text else _filled(scope, node, text)


def _filled(scope: Scope, node: Node, text: str) -> str:
    arguments = scope.call.arguments if scope.call else {}
    parts, end = [], 0
    for match in _BRACES.finditer(text):
        parts.append(text[end : match.start()])
        end = match.end()
        if match.group() in ("{{", "}}"):
            parts.append(match.group()[0])
        elif match.group(1) is not None and match.group(1) in arguments:
            parts.append(arguments[match.group(1)])
        else:
            _report_brace(scope, node, match, arguments)
    return "".join((*parts, text[end:]))


def _report_brace(scope: Scope, node: Node, match: re.Match[str], arguments: Iterable[str]) -> None:
    mark, name = scope.page.part_mark(node, *match.span()), match.group(1)
    if name is None:
        scope.page.report(mark, "This brace has no partner.", "For a brace in a text write it twice: {{ or }}.")
    elif scope.call is None:
        sentence = f"{quoted(match.group())} stands for a parameter, but here is no routine."
        scope.page.report(mark, sentence, "Write the word itself; for a brace in a text write {{ or }}.")
    else:
        sentence = f"The routine has no parameter {quoted(name)}."
        scope.page.report(mark, sentence, nearest(name, arguments, "parameter") or "Name it under given.")


def read_condition(
    scope: Scope, node: Node | None, example: str, *, until: bool = False, lasting: bool = False
) -> Condition:
    """A condition; with `until` it may be a clock time, and with `lasting` it may say for how long."""
    if node is None:
        return NEVER
    read = parse_until if until else parse_condition
    parsed: Parsed | None = scope.page.phrase(node, read, None, "a condition", example)
    if parsed is None:
        return NEVER
    _check_uses(scope, node, parsed)
    if parsed.lasting is not None and not lasting:
        mark = scope.page.part_mark(node, *parsed.lasting)
        sentence = "Here a condition is looked at once, so it cannot last."
        scope.page.report(mark, sentence, "Leave this out; it belongs to a wait, a charge or a standing order.")
    return parsed.condition


def _check_uses(scope: Scope, node: Node, parsed: Parsed) -> None:
    for use in parsed.uses:
        mark = scope.page.part_mark(node, use.start, use.end)
        if use.what in (Named.COUNT, Named.ANSWER):
            scope.ledger.asked[mark] = scope.page, use.what, use.name
        elif use.what is Named.PROVEN and not scope.proves:
            help_text = "Add for example: prove: {legs arrive: 95 %, confidence: 90 %}"
            scope.page.report(mark, "This mission has nothing to prove.", help_text)
        elif use.what is Named.LAPS and not scope.in_loop:
            scope.page.report(mark, "There are no laps here, outside a loop.", "Write this inside a repeat.")
