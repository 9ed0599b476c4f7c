"""What a mission file says and never uses, and what it relies on without saying so: never an error."""

from __future__ import annotations

from collections.abc import Iterator

from runner.language.diagnostics import WHOLE_FILE, Diagnostic, Severity
from runner.language.mission import (
    Ask,
    Charge,
    Count,
    End,
    Go,
    Mark,
    Mission,
    Notify,
    Order,
    Repeat,
    RetryRule,
    Run,
    Step,
    Visit,
    Wait,
    When,
)
from runner.machine.findings import Finding
from runner.machine.ordering import EXACT_MOST


def check_usage(mission: Mission) -> list[Finding]:
    """Findings `unused-rule`, `unused-routine`, `place-never-visited`, `default-otherwise` and `order-not-exact`."""
    steps = list(every_step(mission))
    return [
        *_unused_rules(mission, steps),
        *_unused_routines(mission),
        *_default_otherwise(steps),
        *_not_exact(steps),
        *_places_not_visited(mission, steps),
    ]


def every_step(mission: Mission) -> Iterator[Step]:
    """All steps of a mission, standing orders included, each before the steps in it. Without recursion."""
    waiting: list[Step] = [*mission.steps, *(step for order in mission.orders for step in order.steps)][::-1]
    while waiting:
        step = waiting.pop()
        yield step
        waiting += steps_in(step)[::-1]


def steps_in(step: Step) -> list[Step]:
    """The steps written inside a step, in the order of the text."""
    match step:
        case Go() | Charge() | Wait():
            return _listed(step.otherwise)
        case Visit():
            return [inner for steps in step.each for inner in steps] + _listed(step.otherwise)
        case Repeat() | Run():
            return list(step.steps)
        case When():
            return [*step.then, *step.otherwise]
        case Ask() | Count() | Notify() | End():
            return []


def _listed(otherwise: object) -> list[Step]:
    return list(otherwise) if isinstance(otherwise, tuple) else []


def _unused_rules(mission: Mission, steps: list[Step]) -> Iterator[Finding]:
    used: set[RetryRule] = {step.rule for step in steps if isinstance(step, Go | Visit | Charge)}
    for rule in mission.rules:
        if rule not in used and rule.mark.file == mission.start_mark.file:
            sentence = f'No step uses the retry rule "{rule.name}".'
            advice = "Name it in a step, as `rule: ...`, or take it out."
            yield Finding("unused-rule", Diagnostic(rule.mark, sentence, advice, Severity.WARNING))


def _unused_routines(mission: Mission) -> Iterator[Finding]:
    """Those of the mission's own file; a shared file may well hold more than one mission needs."""
    for name, mark in mission.routines_unused:
        if mark.file == mission.start_mark.file:
            advice = "Run it in a step, as `run: ...`, or take it out."
            yield Finding(
                "unused-routine", Diagnostic(mark, f'No step runs the routine "{name}".', advice, Severity.WARNING)
            )


def _default_otherwise(steps: list[Step]) -> Iterator[Finding]:
    told: set[Mark] = set()
    for step in steps:
        if not isinstance(step, Go | Visit | Charge) or step.otherwise is not None or step.mark in told:
            continue
        if isinstance(step, Visit) and step.each:
            continue
        told.add(step.mark)
        sentence = "Nothing is written for a failure of this leg, so the mission ends there: the robot halts."
        advice = "Write `otherwise: end` to say that this is meant, or what is to be done instead."
        yield Finding("default-otherwise", Diagnostic(step.mark, sentence, advice, Severity.NOTE))


def _not_exact(steps: list[Step]) -> Iterator[Finding]:
    for step in steps:
        if isinstance(step, Visit) and step.order is Order.SHORTEST and len(step.places) > EXACT_MOST:
            sentence = f"The order of these {len(step.places)} places is short, but perhaps not the shortest."
            advice = f"Up to {EXACT_MOST} places the shortest order is found for sure."
            yield Finding("order-not-exact", Diagnostic(step.mark, sentence, advice, Severity.NOTE))


def _places_not_visited(mission: Mission, steps: list[Step]) -> Iterator[Finding]:
    visited = {mission.start.name} | {step.place.name for step in steps if isinstance(step, Go | Charge)}
    visited |= {place.name for step in steps if isinstance(step, Visit) for _, place in step.places}
    left = [place.name for place in mission.site.places if place.name not in visited]
    if left:
        sentence = (
            f"No step goes to {len(left)} of the {len(mission.site.places)} places of the site: {', '.join(left)}."
        )
        mark = Mark(mission.start_mark.file, WHOLE_FILE, 1)
        yield Finding("place-never-visited", Diagnostic(mark, sentence, "", Severity.NOTE))
