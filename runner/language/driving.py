"""What a robot file says of how the robot drives: sideways, odometry, planner and follower. See FILES.md."""

from __future__ import annotations

import re

from runner.language.diagnostics import quoted
from runner.language.fields import Fields, Keys, mapping
from runner.language.quantities import ANGLE, LENGTH, SHARE, SPEED, Amount, PhraseError
from runner.site.values import Odometry

DRIVING_KEYS: Keys = {
    "sideways speed": "0.3 m/s",
    "odometry": "{way by way: 5 %, turn by turn: 3 %}",
    "planner": "disc-search",
    "follower": "dynamic-window",
}
ODOMETRY_KEYS: Keys = {
    "way by way": "5 %",
    "way by turn": "1 cm",
    "turn by way": "1.2 deg",
    "turn by turn": "3 %",
    "last turn by way": "0.3 deg",
    "last turn by turn": "1 %",
}
PART = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]{0,60}")


def read_sideways_speed(robot: Fields) -> float:
    """0 where the robot cannot go sideways."""
    return robot.number_or("sideways speed", Amount("The sideways speed", SPEED, "0 m/s", "3 m/s"), 0.0)


def read_odometry(robot: Fields) -> Odometry:
    """How far off the wheels' account is; what is left out is as usual."""
    node, usual = robot.get("odometry"), Odometry()
    body = None if node is None else mapping(robot.page, node, '"odometry"', DRIVING_KEYS["odometry"])
    if body is None:
        return usual
    fields = Fields(robot.page, body, "odometry", ODOMETRY_KEYS)
    share, way = Amount("This deviation", SHARE, "0 %", "100 %"), Amount("This deviation", LENGTH, "0 cm", "1 m")
    turn = Amount("This deviation", ANGLE, "0 deg", "90 deg")
    return Odometry(
        way_by_way=fields.number_or("way by way", share, usual.way_by_way),
        way_by_turn=fields.number_or("way by turn", way, usual.way_by_turn),
        turn_by_way=fields.number_or("turn by way", turn, usual.turn_by_way),
        turn_by_turn=fields.number_or("turn by turn", share, usual.turn_by_turn),
        last_turn_by_way=fields.number_or("last turn by way", turn, usual.last_turn_by_way),
        last_turn_by_turn=fields.number_or("last turn by turn", share, usual.last_turn_by_turn),
    )


def parse_part(text: str) -> str:
    """The name of an installed part. Whether it is installed is found when the robot is made."""
    if not PART.fullmatch(text):
        help_text = "Write letters, digits, hyphens, dots and underscores, as in disc-search."
        raise PhraseError(0, len(text), f"No planner or follower can be called {quoted(text)}.", help_text)
    return text
