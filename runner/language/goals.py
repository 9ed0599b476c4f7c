"""Where a `go` leads: a place by its name, a pose on the floor, or a move seen from where the robot stands."""

from __future__ import annotations

import re

from runner.language.diagnostics import quoted
from runner.language.fields import Fields, Keys, mapping
from runner.language.nodes import Mapping, Node, Scalar
from runner.language.phrases import parse_facing
from runner.language.quantities import LENGTH, Amount, PhraseError
from runner.language.scope import NOWHERE, Scope, find_place, read_place
from runner.site.values import Place, Pose

X = Amount("An x on the floor", LENGTH, "0 m", "500 m")
Y = Amount("A y on the floor", LENGTH, "0 m", "500 m")
MOVE = Amount("A move", LENGTH, "5 cm", "50 m")
POSE_KEYS: Keys = {"x": "3 m", "y": "4 m", "facing": "90 deg"}

DIRECTIONS = {"ahead": (1.0, 0.0), "back": (-1.0, 0.0), "left": (0.0, 1.0), "right": (0.0, -1.0)}
"""Unit vectors in the frame of the robot: x ahead, y to the left."""

_MOVE_PHRASE = re.compile(rf"({'|'.join(DIRECTIONS)})(?: +(.*))?")


def read_goal(scope: Scope, node: Node) -> tuple[Place, bool]:
    """The place, and whether its pose is seen from where the robot stands."""
    if isinstance(node, Mapping):
        return _read_pose(scope, node), False
    if isinstance(node, Scalar) and node.text and find_place(scope, node.text) is None:
        move = _MOVE_PHRASE.fullmatch(node.text)
        if move is not None:
            example = "ahead 3 m"
            place = scope.page.phrase(node, lambda _: _parse_move(move), NOWHERE, "a move", example)
            return place, True
    return read_place(scope, node), False


def _parse_move(move: re.Match[str]) -> Place:
    word, length = move.groups()
    if not length:
        raise PhraseError(0, len(word), f"{quoted(word)} needs a length.", f"Write for example {word} 3 m.")
    try:
        meters = MOVE.read(length)
    except PhraseError as error:
        start = move.start(2)
        raise PhraseError(start + error.start, start + error.end, error.sentence, error.help) from None
    x, y = DIRECTIONS[word]
    return Place(f"{word} {meters:g} m", Pose(x * meters, y * meters, 0.0))


def _read_pose(scope: Scope, node: Mapping) -> Place:
    page = scope.page
    body = mapping(page, node, "a pose", "{x: 3 m, y: 4 m, facing: 90 deg}")
    if body is None:
        return NOWHERE
    fields = Fields(page, body, "a pose", POSE_KEYS)
    x, y = fields.number("x", X), fields.number("y", Y)
    facing = fields.need("facing")
    heading = 0.0 if facing is None else page.phrase(facing, parse_facing, 0.0, "a direction", POSE_KEYS["facing"])
    site = scope.site
    if site is not None and not (x <= site.width and y <= site.height):
        help_text = f"The floor of {quoted(site.name)} is {site.width:g} m x {site.height:g} m from 0, 0."
        page.report(node, "This pose lies beyond the floor.", help_text)
    return Place(f"x {x:g} m, y {y:g} m", Pose(x, y, heading))
