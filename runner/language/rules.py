"""Retry rules: when a leg counts as stalled, what is tried, how often, and when to give up."""

from __future__ import annotations

from runner.language.diagnostics import quoted
from runner.language.fields import Fields, Keys, items, mapping, name
from runner.language.mission import Mark, Recovery, RecoveryKind, Rest, RetryRule
from runner.language.nodes import Node, Scalar
from runner.language.pages import Page
from runner.language.phrases import parse_recovery, parse_rest, parse_stall
from runner.language.quantities import DURATION, Amount, Count

DEFAULT_RULE = RetryRule(
    name="default",
    tries=3,
    rest=Rest(first=20.0, factor=2.0, most=120.0),
    stall_progress=0.3,
    stall_window=12.0,
    recover=(
        Recovery(RecoveryKind.REPLAN),
        Recovery(RecoveryKind.CLEAR, 3.0),
        Recovery(RecoveryKind.REPLAN),
        Recovery(RecoveryKind.EASE_BACK, 0.4),
        Recovery(RecoveryKind.REST, 30.0),
    ),
    give_up_after=600.0,
    mark=Mark("built in", 1, 1),
)
"""The rule of every step that names none, unless the mission writes a rule of this name; and what a written rule
leaves out is as here. Three tries of five recoveries see a door opened late or a corridor cleared, and end within
ten minutes, before anybody waiting at the next stop goes to look."""

TRIES = Count("The number of tries", 1, 50)
GIVE_UP = Amount("The time to give up after", DURATION, "1 s", "24 h")
RECOVERIES_MOST = 20

RULE_KEYS: Keys = {
    "tries": "3",
    "rest between tries": "20 s, doubling to 2 min",
    "stalled when": "under 0.3 m of progress in 12 s",
    "recover": "[replan, clear 3 m, ease back 0.4 m, rest 30 s]",
    "give up after": "8 min",
}


def read_rule(page: Page, key: Scalar, node: Node) -> RetryRule:
    """One retry rule; the built-in one under its name after a report."""
    rule_name = name(page, key, "patient")
    body = mapping(page, node, f"the retry rule {quoted(rule_name)}", "{tries: 3}")
    if body is None:
        return DEFAULT_RULE
    fields = Fields(page, body, "a retry rule", RULE_KEYS)
    progress, window = fields.phrase(
        "stalled when", parse_stall, (DEFAULT_RULE.stall_progress, DEFAULT_RULE.stall_window)
    )
    give_up = fields.get("give up after")
    return RetryRule(
        name=rule_name,
        tries=fields.count("tries", TRIES) if fields.get("tries") is not None else DEFAULT_RULE.tries,
        rest=fields.phrase("rest between tries", parse_rest, DEFAULT_RULE.rest),
        stall_progress=progress,
        stall_window=window,
        recover=_read_recoveries(page, fields.get("recover")),
        give_up_after=DEFAULT_RULE.give_up_after if give_up is None else fields.number("give up after", GIVE_UP),
        mark=page.mark(key),
    )


def _read_recoveries(page: Page, node: Node | None) -> tuple[Recovery, ...]:
    if node is None:
        return DEFAULT_RULE.recover
    listed = items(page, node, "recoveries", RULE_KEYS["recover"])
    if len(listed) > RECOVERIES_MOST:
        page.report(
            node, f"This lists {len(listed)} recoveries.", f"List at most {RECOVERIES_MOST}; tries repeat them."
        )
    stand_in = DEFAULT_RULE.recover[0]
    return tuple(page.phrase(item, parse_recovery, stand_in, "a recovery", "clear 3 m") for item in listed)
