"""A JSON Schema (draft 2020-12) of mission files, for editors that complete keys and mark slips while one types.

Keys and examples come from the same tables the reader uses; what a value looks like is told here, by key. A schema sees
what YAML made of a text, so a clock time or `no` may come as a number or a truth value; scalars are taken as they come.
What it cannot know (whether a place is there, whether a condition is sound) `trundle check` tells.
"""

from __future__ import annotations

from typing import Any

from runner.language import legs, mission_file, nested, orders, quantities, routines, rules, steps
from runner.language.fields import Keys
from runner.language.mission import RecoveryKind

Schema = dict[str, Any]

DIALECT = "https://json-schema.org/draft/2020-12/schema"
SCALAR: Schema = {"type": ["string", "number", "boolean"]}
TEXT: Schema = {"type": "string", "minLength": 1}


def mission_schema() -> Schema:
    """The schema as a value that JSON can hold."""
    needed = ("mission", "site", "robot", "start", "steps")
    whole = _mapping("a mission", mission_file.MISSION_KEYS, needed, _TOP)
    return {
        "$schema": DIALECT,
        "title": "Trundle mission",
        **whole,
        "$defs": {
            "steps": {"type": "array", "minItems": 1, "items": {"anyOf": [_ref(verb) for verb in _STEPS]}},
            "otherwise": {"anyOf": [{"enum": list(legs.OTHERWISE_WORDS)}, _ref("steps")]},
            **_STEPS,
        },
    }


def _ref(name: str) -> Schema:
    return {"$ref": f"#/$defs/{name}"}


def _mapping(what: str, keys: Keys, needed: tuple[str, ...], values: dict[str, Schema]) -> Schema:
    """A mapping with the keys of a table; those without a value of their own in `values` hold a scalar."""
    return {
        "type": "object",
        "description": f"The keys of {what}.",
        "properties": {
            key: {**values.get(key, SCALAR), "description": f"For example {key}: {example}"}
            for key, example in keys.items()
        },
        "required": list(needed),
        "additionalProperties": False,
    }


def _named(schema: Schema) -> Schema:
    """Names chosen by the author, each with such a value."""
    return {"type": "object", "minProperties": 1, "additionalProperties": schema}


def _list_of(schema: Schema) -> Schema:
    return {"type": "array", "minItems": 1, "items": schema}


def _measured(measure: quantities.Measure) -> Schema:
    """A number and a unit."""
    units = "|".join(unit.replace("/", r"\/") for unit in measure.units)
    return {"type": "string", "pattern": rf"^[+-]?[0-9]+(\.[0-9]+)? ?({units})$"}


_DURATION, _SHARE = _measured(quantities.DURATION), _measured(quantities.SHARE)
_WHOLE: Schema = {"type": "integer", "minimum": 1}
_OTHERWISE, _STEP_LIST = _ref("otherwise"), _ref("steps")
_LEG: dict[str, Schema] = {"rule": TEXT, "within": _DURATION, "otherwise": _OTHERWISE}
_RECOVERY: Schema = {"type": "string", "pattern": f"^({'|'.join(kind.value for kind in RecoveryKind)})"}

_POSE = _mapping(
    "a pose",
    {"x": "3 m", "y": "4 m", "facing": "90 deg"},
    ("x", "y", "facing"),
    dict.fromkeys(("x", "y"), _measured(quantities.LENGTH)),
)
_WAIT = _mapping("a wait", steps.WAIT_BODY_KEYS, ("until",), {"up to": _DURATION, "otherwise": _OTHERWISE})
_CHARGE = _mapping(
    "charge",
    legs.CHARGE_BODY_KEYS,
    ("at", "until"),
    {"at": TEXT, "up to": _DURATION, "rule": TEXT, "otherwise": _OTHERWISE},
)
_REPEAT = _mapping(
    "repeat",
    nested.REPEAT_BODY_KEYS,
    ("steps",),
    {
        "times": _WHOLE,
        "for": _DURATION,
        "every": _DURATION,
        "if a lap overruns": {"enum": list(nested.OVERRUN_WORDS)},
        "steps": _STEP_LIST,
    },
)

_STEPS: dict[str, Schema] = {
    "go": _mapping("the step go", legs.GO_KEYS, ("go",), {"go": {"anyOf": [TEXT, _POSE]}, **_LEG}),
    "visit": _mapping(
        "the step visit",
        legs.VISIT_KEYS,
        ("visit",),
        {"visit": _list_of(TEXT), "order": {"enum": list(legs.ORDER_WORDS)}, "each": TEXT, **_LEG},
    ),
    "wait": _mapping("the step wait", steps.WAIT_KEYS, ("wait",), {"wait": {"anyOf": [_DURATION, _WAIT]}}),
    "ask": _mapping(
        "the step ask", steps.ASK_KEYS, tuple(steps.ASK_KEYS), {"answers": _list_of(SCALAR), "up to": _DURATION}
    ),
    "charge": _mapping("the step charge", legs.CHARGE_KEYS, ("charge",), {"charge": _CHARGE}),
    "repeat": _mapping("the step repeat", nested.REPEAT_KEYS, ("repeat",), {"repeat": _REPEAT}),
    "when": _mapping("the step when", nested.WHEN_KEYS, ("when", "then"), {"then": _STEP_LIST, "else": _STEP_LIST}),
    "run": _mapping("the step run", routines.RUN_KEYS, ("run",), {"with": _named(SCALAR)}),
    "count": _mapping("the step count", steps.COUNT_KEYS, ("count",), {"count": TEXT, "by": _WHOLE}),
    "notify": _mapping("the step notify", steps.NOTIFY_KEYS, ("notify",), {}),
    "end": _mapping("the step end", steps.END_KEYS, ("end",), {"end": {"enum": list(steps.ENDS)}}),
}
"""One definition a step."""

_TOP: dict[str, Schema] = {
    "site": TEXT,
    "robot": TEXT,
    "include": _list_of(TEXT),
    "silence": _list_of(TEXT),
    "retry rules": _named(
        _mapping(
            "a retry rule",
            rules.RULE_KEYS,
            (),
            {"tries": _WHOLE, "give up after": _DURATION, "recover": _list_of(_RECOVERY)},
        )
    ),
    "limits": _mapping("limits", mission_file.LIMIT_KEYS, (), {"speed": _measured(quantities.SPEED)}),
    "prove": _mapping("prove", orders.PROVE_KEYS, tuple(orders.PROVE_KEYS), dict.fromkeys(orders.PROVE_KEYS, _SHARE)),
    "standing orders": _list_of(
        _mapping(
            "a standing order",
            orders.ORDER_KEYS,
            ("name", "when", "do"),
            {"name": TEXT, "do": _STEP_LIST, "then": {"enum": list(orders.THEN_WORDS)}},
        )
    ),
    "routines": _named(
        _mapping("a routine", routines.ROUTINE_KEYS, ("steps",), {"given": _list_of(TEXT), "steps": _STEP_LIST})
    ),
    "steps": _STEP_LIST,
}
