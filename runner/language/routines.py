"""Routines: steps written once and used in many places, with parameters. They are written out where they are run.

Each routine is first read for itself, as a draft, so that a mistake in it is told once, however often it is run; that
also finds which parameters stand for places, and routines that run themselves. Then it is read again for each set of
arguments, once, and the steps are shared by all places that run it so.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

from runner.language.diagnostics import nearest, quoted, shown
from runner.language.fields import Fields, Keys, mapping, name
from runner.language.mission import Run, Step
from runner.language.nodes import Mapping, Node, Scalar
from runner.language.pages import Page
from runner.language.scope import Call, Scope, read_place, read_text

STEPS_MOST = 200_000
"""Steps of a mission with its routines written out. A night of legs of ten seconds has 3,600."""

NESTING_MOST = 40
"""Lists of steps in lists of steps, with the routines written out."""

ROUTINE_KEYS: Keys = {"given": "[room]", "steps": "[go: ward east]"}
RUN_KEYS: Keys = {"run": "hand over", "with": "{room: ward east}"}


@dataclass(slots=True)
class Routine:
    """A routine as it is written. What its draft has found: `as_places` are the parameters used as places, `height`
    is how deep it nests steps; it `is_sound` if nothing is wrong with it."""

    name: str
    page: Page
    key: Scalar
    parameters: tuple[str, ...]
    steps: Node | None
    as_places: set[str] | None = None
    height: int = 0
    is_sound: bool = False


@dataclass(slots=True)
class Library:
    """The routines of a mission by name; those whose drafts are being read; and those written out, by arguments."""

    routines: dict[str, Routine] = field(default_factory=dict)
    chain: list[str] = field(default_factory=list)
    written: dict[tuple[str, ...], tuple[tuple[Step, ...], int]] = field(default_factory=dict)
    is_full: bool = False


def read_routine(page: Page, key: Scalar, node: Node) -> Routine:
    """A routine, its steps yet unread."""
    routine_name = name(page, key, "hand over")
    body = mapping(page, node, f"the routine {quoted(routine_name)}", "{given: [room], steps: [go: room]}")
    if body is None:
        return Routine(routine_name, page, key, (), None)
    fields = Fields(page, body, "a routine", ROUTINE_KEYS)
    return Routine(routine_name, page, key, _read_parameters(fields), fields.need("steps"))


def _read_parameters(fields: Fields) -> tuple[str, ...]:
    found: list[str] = []
    for node in fields.items("given"):
        text = name(fields.page, node, "room")
        if text in found:
            fields.page.report(node, f"{quoted(text)} is given twice.", "Give each parameter a name of its own.")
        elif "{" in text or "}" in text:
            fields.page.report(node, "The name of a parameter has no braces.", "Write for example room.")
        else:
            found.append(text)
    return tuple(found)


def draft_all(scope: Scope) -> None:
    """Read every routine for itself."""
    for routine in scope.library.routines.values():
        _check_parameters(scope, routine)
        _draft(scope, routine)


def _check_parameters(scope: Scope, routine: Routine) -> None:
    for parameter in routine.parameters:
        if scope.places is not None and parameter in scope.places:
            sentence = f"{quoted(parameter)} is a place of the site, and a parameter of this routine."
            routine.page.report(routine.key, sentence, "Give the parameter another name.")


def _draft(scope: Scope, routine: Routine) -> None:
    """Read a routine with nothing yet for its parameters, once."""
    library, ledger, problems = scope.library, scope.ledger, scope.page.reading.problems
    if routine.as_places is not None or routine.steps is None:
        return
    before, steps, deepest = len(problems), ledger.steps, ledger.deepest
    call = Call({parameter: parameter for parameter in routine.parameters}, draft=True)
    routine.as_places = call.as_places
    library.chain.append(routine.name)
    ledger.deepest = scope.depth
    scope.read_steps(replace(scope, page=routine.page, in_loop=False, call=call), routine.steps, "steps")
    library.chain.pop()
    routine.height = ledger.deepest - scope.depth
    ledger.steps, ledger.deepest = steps, max(deepest, ledger.deepest)
    routine.is_sound = len(problems) == before


def read_run(scope: Scope, node: Mapping) -> Step | None:
    """The step run."""
    fields = Fields(scope.page, node, "the step run", RUN_KEYS)
    routine = _find(scope, node.pairs["run"][1])
    if routine is None:
        return None
    arguments = _read_arguments(scope, fields, routine)
    if arguments is None:
        return None
    title = f"{routine.name} ({', '.join(arguments)})" if arguments else routine.name
    return Run(fields.pair_mark("run"), title, _write_out(scope, node.pairs["run"][1], routine, arguments))


def write_out_for_each(scope: Scope, node: Node, places: list[Node]) -> tuple[tuple[Step, ...], ...]:
    """The steps of a routine for each place of a visit; none after a report."""
    routine = _find(scope, node)
    if routine is None:
        return ()
    if len(routine.parameters) != 1:
        count = len(routine.parameters) or "no"
        sentence = f"The routine {quoted(routine.name)} has {count} parameters, but each place is given as one."
        scope.page.report(node, sentence, "Name a routine with one parameter, for example given: [room].")
        return ()
    texts = [place.text for place in places if isinstance(place, Scalar)]
    given = scope.call.arguments if scope.call else {}
    return tuple(_write_out(scope, node, routine, (given.get(text, text),)) for text in texts)


def _find(scope: Scope, node: Node) -> Routine | None:
    """The routine a scalar names, drafted; None after a report."""
    page, library = scope.page, scope.library
    text = page.text(node, "a routine", RUN_KEYS["run"])
    routine = None if text is None else library.routines.get(text)
    if routine is None:
        if text is not None:
            help_text = nearest(text, library.routines, "routine") or "Write it under routines."
            page.report(node, f"There is no routine called {quoted(text)}.", help_text)
        return None
    if routine.name in library.chain:
        chain = [*library.chain[library.chain.index(routine.name) :], routine.name]
        page.report(node, "A routine cannot run itself.", f"The chain is {shown_chain(chain)}. Use a repeat.")
        return None
    _draft(scope, routine)
    if scope.depth + routine.height > NESTING_MOST:
        report_nesting(page, node)
        return None
    scope.ledger.deepest = max(scope.ledger.deepest, scope.depth + routine.height)
    return routine


def report_nesting(page: Page, node: Node) -> None:
    """Tell that steps are nested too deep here."""
    sentence = f"Here steps are nested over {NESTING_MOST} deep, with the routines written out."
    page.report(node, sentence, "Write it flatter.")


def shown_chain(names: list[str]) -> str:
    """Names joined by arrows; the middle of a long chain is left out."""
    parts = [shown(part) for part in names]
    return " -> ".join(parts if len(parts) <= 8 else [*parts[:4], "...", *parts[-3:]])


def _read_arguments(scope: Scope, fields: Fields, routine: Routine) -> tuple[str, ...] | None:
    """What stands for each parameter, in their order; None after a report."""
    page, node = scope.page, fields.get("with")
    body = None if node is None else mapping(page, node, '"with"', RUN_KEYS["with"])
    if node is not None and body is None:
        return None
    pairs = {} if body is None else body.pairs
    unknown = [key for text, (key, _) in pairs.items() if text not in routine.parameters]
    for key in unknown:
        sentence = f"The routine {quoted(routine.name)} has no parameter {quoted(key.text)}."
        page.report(key, sentence, nearest(key.text, routine.parameters, "parameter") or "Leave this out.")
    missing = [parameter for parameter in routine.parameters if parameter not in pairs]
    if missing and not unknown:
        listed = ", ".join(f"{shown(parameter)}: ..." for parameter in missing)
        sentence = f"The routine {quoted(routine.name)} needs {quoted(missing[0])}."
        page.report(fields.pair_mark("run"), sentence, f"Add with: {{{listed}}}")
    if unknown or missing:
        return None
    return tuple(_read_argument(scope, routine, parameter, pairs[parameter][1]) for parameter in routine.parameters)


def _read_argument(scope: Scope, routine: Routine, parameter: str, node: Node) -> str:
    if routine.as_places and parameter in routine.as_places:
        return read_place(scope, node).name
    given = scope.call.arguments if scope.call else {}
    if isinstance(node, Scalar) and node.text in given:
        return given[node.text]
    return read_text(scope, node, "what stands for a parameter", "ward east")


def _write_out(scope: Scope, node: Node, routine: Routine, arguments: tuple[str, ...]) -> tuple[Step, ...]:
    """The steps of a routine with its arguments; none in a draft, or if something is wrong with it."""
    library, ledger = scope.library, scope.ledger
    if not routine.is_sound or routine.steps is None or library.is_full or (scope.call and scope.call.draft):
        return ()
    key = (routine.name, *arguments)
    if key in library.written:
        steps, count = library.written[key]
        ledger.steps += count
    else:
        before = ledger.steps
        call = Call(dict(zip(routine.parameters, arguments, strict=True)))
        inner = replace(scope, page=routine.page, in_loop=False, call=call)
        steps = scope.read_steps(inner, routine.steps, "steps")
        library.written[key] = steps, ledger.steps - before
    if ledger.steps > STEPS_MOST and not library.is_full:
        library.is_full = True
        sentence = f"With its routines written out, this mission has over {STEPS_MOST:,} steps."
        scope.page.report(node, sentence, "Use a repeat instead of routines that run routines.")
    return steps
