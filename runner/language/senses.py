"""What a robot file says of the robot's senses: lidar, sweep, its own parts in view, filters. See FILES.md."""

from __future__ import annotations

from runner.language.diagnostics import nearest, quoted
from runner.language.fields import Fields, Keys, mapping
from runner.language.geometry import Coordinates, read_point
from runner.language.nodes import Node
from runner.language.quantities import ANGLE, DURATION, LENGTH, RATE, SHARE, Amount, Count, PhraseError
from runner.site.values import Filters, Lidar, Post, Sweep, UnseenSpace

LIDAR_KEYS: Keys = {
    "field of view": "270 deg",
    "beams": "180",
    "range": "12 m",
    "rate": "8 Hz",
    "noise": "1.5 cm",
    "forward": "15 cm",
    "dropouts": "0.5 %",
    "latency": "0.1 s",
    "beam width": "0.5 deg",
    "height": "18 cm",
}
SWEEP_KEYS: Keys = {
    "field of view": "90 deg",
    "columns": "60",
    "range": "3.5 m",
    "period": "2 s",
    "noise": "2 cm",
    "forward": "25 cm",
}
POST_KEYS: Keys = {"at": "[25 cm, 20 cm]", "thickness": "3 cm"}
FILTER_KEYS: Keys = {"shadow points": "off", "own body": "off", "floor returns": "off"}
SWITCH = {"on": True, "off": False}

NO_LIDAR = Lidar(0.0, 0, 0.0, 0.0, 0.0)
NO_POST = Post((0.0, 0.0), 0.01)


def read_lidar(robot: Fields) -> Lidar:
    """The lidar of a robot; one that must not be used after a report."""
    fields = _inner(robot, robot.need("lidar"), "lidar", "a lidar", LIDAR_KEYS)
    if fields is None:
        return NO_LIDAR
    return Lidar(
        field_of_view=fields.number("field of view", Amount("The field of view", ANGLE, "10 deg", "360 deg")),
        beams=fields.count("beams", Count("The number of beams", 8, 4000)),
        range_max=fields.number("range", Amount("The range", LENGTH, "0.5 m", "100 m")),
        rate=fields.number("rate", Amount("The rate of scans", RATE, "0.5 Hz", "100 Hz")),
        noise=fields.number("noise", Amount("The noise of a range", LENGTH, "0 cm", "50 cm")),
        forward=fields.number_or("forward", Amount("The mounting of the lidar", LENGTH, "-2 m", "2 m"), 0.0),
        dropouts=fields.number_or("dropouts", Amount("The share of dropouts", SHARE, "0 %", "90 %"), 0.0),
        latency=fields.number_or("latency", Amount("The latency of a scan", DURATION, "0 s", "1 s"), 0.0),
        beam_width=fields.number_or("beam width", Amount("The width of a beam", ANGLE, "0 deg", "5 deg"), 0.0),
        height=fields.number_or("height", Amount("The height of the lidar", LENGTH, "2 cm", "3 m"), 0.0),
    )


def read_sweep(robot: Fields) -> Sweep | None:
    """The sweeping sensor of a robot, where it has one."""
    node = robot.get("sweep")
    fields = None if node is None else _inner(robot, node, "sweep", "a sweep", SWEEP_KEYS)
    if fields is None:
        return None
    return Sweep(
        field_of_view=fields.number("field of view", Amount("The field of view", ANGLE, "10 deg", "180 deg")),
        columns=fields.count("columns", Count("The number of columns", 8, 1000)),
        range_max=fields.number("range", Amount("The range", LENGTH, "0.5 m", "10 m")),
        period=fields.number_or("period", Amount("The time of a sweep", DURATION, "0.2 s", "10 s"), 2.0),
        noise=fields.number_or("noise", Amount("The noise of a range", LENGTH, "0 cm", "50 cm"), 0.0),
        forward=fields.number_or("forward", Amount("The mounting of the sweep", LENGTH, "-2 m", "2 m"), 0.0),
    )


def read_posts(robot: Fields, coordinates: Coordinates) -> tuple[Post, ...]:
    """The parts of the robot that stand in its lidar's view."""
    return tuple(_read_post(robot, node, coordinates) for node in robot.items("posts"))


def _read_post(robot: Fields, node: Node, coordinates: Coordinates) -> Post:
    fields = _inner(robot, node, "a post", "a post", POST_KEYS)
    at_node = None if fields is None else fields.need("at")
    at = None if at_node is None else read_point(robot.page, at_node, coordinates)
    if fields is None or at is None:
        return NO_POST
    return Post(at, fields.number("thickness", Amount("The thickness of a post", LENGTH, "5 mm", "50 cm")))


def read_filters(robot: Fields) -> Filters:
    """The filters of a robot, each of which is on unless it says otherwise."""
    node = robot.get("filters")
    fields = None if node is None else _inner(robot, node, "filters", "a set of filters", FILTER_KEYS)
    if fields is None:
        return Filters()
    return Filters(
        shadow_points=fields.phrase("shadow points", _parse_switch, True),
        own_body=fields.phrase("own body", _parse_switch, True),
        floor_returns=fields.phrase("floor returns", _parse_switch, True),
    )


def parse_unseen_space(text: str) -> UnseenSpace:
    """`keep out` or `drive slowly`."""
    words = [one.value for one in UnseenSpace]
    if text not in words:
        help_text = nearest(text, words, "wording")
        raise PhraseError(0, len(text), f"What to do about unseen space cannot be {quoted(text)}.", help_text)
    return UnseenSpace(text)


def _parse_switch(text: str) -> bool:
    if text not in SWITCH:
        raise PhraseError(0, len(text), f"A filter is on or off, not {quoted(text)}.", "Write on or off.")
    return SWITCH[text]


def _inner(robot: Fields, node: Node | None, key: str, what: str, keys: Keys) -> Fields | None:
    """The keys of a mapping within the robot's, or None after a report."""
    example = robot.keys.get(key, "{at: [25 cm, 20 cm], thickness: 3 cm}")
    title = quoted(key) if key in robot.keys else key
    body = None if node is None else mapping(robot.page, node, title, example)
    return None if body is None else Fields(robot.page, body, what, keys)
