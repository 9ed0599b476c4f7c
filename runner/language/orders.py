"""Standing orders, and what a mission is to prove."""

from __future__ import annotations

from runner.language.diagnostics import nearest, quoted
from runner.language.fields import Fields, Keys, mapping
from runner.language.mission import Prove, StandingOrder, Then
from runner.language.nodes import Node
from runner.language.quantities import SHARE, Amount
from runner.language.scope import Scope, read_condition

ORDERS_MOST = 20
ORDER_KEYS: Keys = {
    "name": "low battery",
    "when": "battery < 20 %",
    "do": "[charge: {at: charging bay, until: battery >= 70 %}]",
    "then": "carry on",
}
PROVE_KEYS: Keys = {"legs arrive": "95 %", "confidence": "90 %"}
THEN_WORDS = {then.value: then for then in Then}

LEGS_ARRIVE = Amount("The share of legs that arrive", SHARE, "1 %", "99.99 %")
CONFIDENCE = Amount("The confidence", SHARE, "50 %", "99.99 %")


def read_orders(scope: Scope, fields: Fields) -> tuple[StandingOrder, ...]:
    """The standing orders of a mission; those at fault are left out after a report."""
    listed = fields.items("standing orders")
    if len(listed) > ORDERS_MOST:
        fields.page.report(listed[ORDERS_MOST], f"A mission has at most {ORDERS_MOST} standing orders.", "Join some.")
        return ()
    found: list[StandingOrder] = []
    for node in listed:
        order = _read_order(scope, node)
        if order is not None and order.name and order.name in (other.name for other in found):
            sentence = f"There are two standing orders called {quoted(order.name)}."
            fields.page.report(order.mark, sentence, "Give each a name of its own.")
        elif order is not None:
            found.append(order)
    return tuple(found)


def _read_order(scope: Scope, node: Node) -> StandingOrder | None:
    page = scope.page
    body = mapping(page, node, "a standing order", "{name: low battery, when: battery < 20 %, do: [...]}")
    if body is None:
        return None
    fields = Fields(page, body, "a standing order", ORDER_KEYS)
    name, when, do = fields.name("name"), fields.need("when"), fields.need("do")
    then = _read_then(fields)
    if when is None or do is None:
        return None
    condition = read_condition(scope, when, ORDER_KEYS["when"], lasting=True)
    mark = fields.pair_mark("name") if "name" in body.pairs else page.mark(body)
    return StandingOrder(mark, name, condition, scope.read_steps(scope, do, '"do"'), then)


def _read_then(fields: Fields) -> Then:
    node = fields.get("then")
    text = None if node is None else fields.page.text(node, "what follows a standing order", ORDER_KEYS["then"])
    if node is None or text is None:
        return Then.CARRY_ON
    if text not in THEN_WORDS:
        sentence = f"{quoted(text)} does not say what follows a standing order."
        fields.page.report(node, sentence, nearest(text, THEN_WORDS, "wording"))
    return THEN_WORDS.get(text, Then.CARRY_ON)


def read_prove(fields: Fields) -> Prove | None:
    """What is to be proved; None where the mission says nothing of it."""
    node = fields.get("prove")
    body = (
        None if node is None else mapping(fields.page, node, quoted("prove"), "{legs arrive: 95 %, confidence: 90 %}")
    )
    if body is None:
        return None
    inner = Fields(fields.page, body, quoted("prove"), PROVE_KEYS)
    return Prove(inner.number("legs arrive", LEGS_ARRIVE), inner.number("confidence", CONFIDENCE))
