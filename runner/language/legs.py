"""The steps that drive: go, visit and charge, and what follows when a leg fails."""

from __future__ import annotations

from runner.language.diagnostics import nearest, quoted
from runner.language.fields import Fields, Keys, amount, items, mapping
from runner.language.goals import read_goal
from runner.language.mission import Charge, Go, Order, Otherwise, RetryRule, Step, Visit
from runner.language.nodes import Mapping, Node, Sequence
from runner.language.quantities import DURATION, Amount
from runner.language.routines import write_out_for_each
from runner.language.scope import Scope, read_condition, read_place, read_rule_name

WITHIN = Amount("The time for a leg", DURATION, "1 s", "24 h")
CHARGE_UP_TO = Amount("The time to charge", DURATION, "1 s", "24 h")
ORDERED_MOST = 100
"""Places in a visit that is put in order by the lengths of the routes between them all."""

GO_KEYS: Keys = {"go": "ward east", "rule": "patient", "within": "4 min", "otherwise": "skip"}
VISIT_KEYS: Keys = {
    "visit": "[ward east, laboratory]",
    "order": "shortest",
    "each": "hand over",
    "rule": "patient",
    "within": "4 min",
    "otherwise": "skip",
}
CHARGE_KEYS: Keys = {"charge": "{at: charging bay, until: battery >= 70 %}"}
CHARGE_BODY_KEYS: Keys = {
    "at": "charging bay",
    "until": "battery >= 70 %",
    "up to": "2 h",
    "rule": "patient",
    "otherwise": "skip",
}
LEG_OPTIONS = ("rule", "within", "otherwise")
OTHERWISE_WORDS = {word.value: word for word in Otherwise}
ORDER_WORDS = {order.value: order for order in Order}

LegOptions = tuple[RetryRule, float | None, Otherwise | tuple[Step, ...] | None]


def read_go(scope: Scope, node: Mapping) -> Step:
    fields = Fields(scope.page, node, "the step go", GO_KEYS)
    place, relative = read_goal(scope, node.pairs["go"][1])
    return Go(fields.pair_mark("go"), place, *_leg_options(scope, fields), relative)


def read_visit(scope: Scope, node: Mapping) -> Step:
    page = scope.page
    fields = Fields(page, node, "the step visit", VISIT_KEYS)
    listed = items(page, node.pairs["visit"][1], "places to visit", VISIT_KEYS["visit"])
    places = tuple((page.mark(item), read_place(scope, item)) for item in listed)
    order = _read_order(fields, len(listed))
    each_node = fields.get("each")
    if each_node is not None:
        _refuse_options(fields)
    each = () if each_node is None else write_out_for_each(scope, each_node, listed)
    return Visit(fields.pair_mark("visit"), places, *_leg_options(scope, fields), order, each)


def _read_order(fields: Fields, count: int) -> Order:
    node = fields.get("order")
    text = None if node is None else fields.page.text(node, "an order", VISIT_KEYS["order"])
    if node is None or text is None:
        return Order.LISTED
    order = ORDER_WORDS.get(text)
    if order is None:
        fields.page.report(node, f"There is no order called {quoted(text)}.", nearest(text, ORDER_WORDS, "order"))
    elif order in (Order.SHORTEST, Order.NEAREST) and count > ORDERED_MOST:
        sentence = f"{count} places are too many to be ordered by their distances."
        fields.page.report(node, sentence, f"Visit at most {ORDERED_MOST} in one step, or as listed.")
    return order or Order.LISTED


def _refuse_options(fields: Fields) -> None:
    for key in LEG_OPTIONS:
        if key in fields.mapping.pairs:
            sentence = f'With "each" the routine drives, so {quoted(key)} has no effect here.'
            fields.page.report(fields.mapping.pairs[key][0], sentence, f"Write {key} at the go inside the routine.")


def read_charge(scope: Scope, node: Mapping) -> Step | None:
    page = scope.page
    mark = Fields(page, node, "the step charge", CHARGE_KEYS).pair_mark("charge")
    body = mapping(page, node.pairs["charge"][1], "charge", CHARGE_KEYS["charge"])
    if body is None:
        return None
    fields = Fields(page, body, "the step charge", CHARGE_BODY_KEYS)
    at, until, up_to = fields.need("at"), fields.need("until"), fields.get("up to")
    if at is None or until is None:
        return None
    return Charge(
        mark,
        read_place(scope, at),
        read_rule_name(scope, fields.get("rule")),
        read_condition(scope, until, CHARGE_BODY_KEYS["until"], until=True, lasting=True),
        None if up_to is None else amount(page, up_to, CHARGE_UP_TO, CHARGE_BODY_KEYS["up to"]),
        read_otherwise(scope, fields.get("otherwise"), "a failed leg"),
    )


def _leg_options(scope: Scope, fields: Fields) -> LegOptions:
    """Rule, time limit and what follows a failed leg."""
    limit = fields.get("within")
    return (
        read_rule_name(scope, fields.get("rule")),
        None if limit is None else amount(scope.page, limit, WITHIN, GO_KEYS["within"]),
        read_otherwise(scope, fields.get("otherwise"), "a failed leg"),
    )


def read_otherwise(scope: Scope, node: Node | None, after: str) -> Otherwise | tuple[Step, ...] | None:
    """What follows `after`: a word or a list of steps; None where nothing is written."""
    if node is None:
        return None
    if isinstance(node, Sequence):
        return scope.read_steps(scope, node, "otherwise")
    help_text = "Write skip, end, or a list of steps, each with a dash."
    if isinstance(node, Mapping):
        scope.page.report(node, f"What follows {after} is a word or a list of steps.", help_text)
        return None
    text = scope.page.text(node, f"what follows {after}", GO_KEYS["otherwise"])
    word = None if text is None else OTHERWISE_WORDS.get(text)
    if text is not None and word is None:
        scope.page.report(node, f"{quoted(text)} does not say what follows {after}.", help_text)
    return word
