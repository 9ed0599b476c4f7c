"""Conditions files: what the simulated world does to the robot. The format is written down in FILES.md."""

from __future__ import annotations

from runner.language.diagnostics import nearest, quoted
from runner.language.fields import Fields, Keys, amount, items, mapping
from runner.language.geometry import ORIGIN, Coordinates, read_coordinates, read_point
from runner.language.nodes import Node
from runner.language.pages import Page
from runner.language.phrases import parse_size
from runner.language.quantities import DURATION, LENGTH, SPEED, Amount, Count, PhraseError, parse_clock
from runner.site.values import Carton, Conditions, DoorChange, Point, Site, Walkers

SIDE = Amount("A side of a carton", LENGTH, "5 cm", "5 m")
TIME = Amount("A time since the beginning", DURATION, "0 s", "168 h")
NEAR = Amount("The distance to the robot", LENGTH, "0.5 m", "50 m")
STAYS = Amount("The time a carton stays", DURATION, "1 s", "168 h")
COUNT = Count("The number of walkers", 1, 200)
WALKING = Amount("The walking speed", SPEED, "0.1 m/s", "3 m/s")
UNEVEN = Amount("The unevenness of the floor", LENGTH, "0 mm", "50 mm")
DEVIATION = Amount("The spread of walking speeds", SPEED, "0 m/s", "1 m/s")

CONDITIONS_KEYS: Keys = {
    "conditions": "Quiet",
    "begins at": "18:00",
    "coordinates": "in meters",
    "cartons": "[{at: [20 m, 12 m], size: 60 cm x 40 cm}]",
    "doors": "[{shut: pharmacy door, at: 5 min}]",
    "walkers": "[{count: 4}]",
    "uneven floor": "5 mm",
}
CARTON_KEYS: Keys = {
    "at": "[20 m, 12 m]",
    "size": "60 cm x 40 cm",
    "from": "2 min",
    "until": "10 min",
    "when near": "3 m",
    "stays": "90 s",
}
DOOR_KEYS: Keys = {"shut": "pharmacy door", "open": "pharmacy door", "at": "5 min"}
WALKER_KEYS: Keys = {
    "count": "4",
    "between": "[ward east, kitchen]",
    "speed": "1.3 m/s",
    "speed deviation": "0.26 m/s",
}
DEFAULTS = Conditions()
ONE_WALKER = Walkers(1)


def read_conditions_page(page: Page, site: Site) -> Conditions:
    """The conditions of a page; they must not be used if anything was reported."""
    if page.root is None:
        return DEFAULTS
    fields = Fields(page, page.root, "a conditions file", CONDITIONS_KEYS)
    coordinates = read_coordinates(fields)
    return Conditions(
        name=fields.name("conditions"),
        begins_at=fields.phrase("begins at", parse_clock, DEFAULTS.begins_at),
        cartons=tuple(_read_carton(page, node, site, coordinates) for node in fields.items("cartons")),
        doors=tuple(_read_door_change(page, node, site) for node in fields.items("doors")),
        walkers=tuple(_read_walkers(page, node, site) for node in fields.items("walkers")),
        uneven_floor=fields.number_or("uneven floor", UNEVEN, 0.0),
    )


def _read_carton(page: Page, node: Node, site: Site, coordinates: Coordinates) -> Carton:
    body = mapping(page, node, "a carton", "{at: [20 m, 12 m], size: 60 cm x 40 cm}")
    if body is None:
        return Carton(ORIGIN, (SIDE.least, SIDE.least))
    fields = Fields(page, body, "a carton", CARTON_KEYS)
    size_node = fields.need("size")
    size = (SIDE.least, SIDE.least)
    if size_node is not None:
        size = page.phrase(size_node, _parse_carton_size, size, "a size", CARTON_KEYS["size"])
    near, until, stays = fields.get("when near"), fields.get("until"), fields.get("stays")
    carton = Carton(
        at=_read_spot(fields, site, coordinates),
        size=size,
        from_s=fields.number_or("from", TIME, 0.0),
        until_s=None if until is None else fields.number("until", TIME),
        when_near=None if near is None else fields.number("when near", NEAR),
        stays_s=None if stays is None else fields.number("stays", STAYS),
    )
    _check_times(fields, carton)
    return carton


def _read_spot(fields: Fields, site: Site, coordinates: Coordinates) -> Point:
    node = fields.need("at")
    point = None if node is None else read_point(fields.page, node, coordinates)
    if node is None or point is None:
        return ORIGIN
    if not (0.0 <= point[0] <= site.width and 0.0 <= point[1] <= site.height):
        help_text = f"The floor of {quoted(site.name)} is {site.width:g} m x {site.height:g} m from 0, 0."
        fields.page.report(node, "This carton lies beyond the floor.", help_text)
    return point


def _parse_carton_size(text: str) -> tuple[float, float]:
    """`60 cm x 40 cm`, or one length for a square."""
    try:
        side = SIDE.read(text)
    except PhraseError:
        if " x " not in text:
            raise
        return parse_size(text, SIDE)
    return side, side


def _check_times(fields: Fields, carton: Carton) -> None:
    """`until` ends what begins with `from`, `stays` what begins with `when near`; each goes with its own."""
    pairs, page = fields.mapping.pairs, fields.page
    if carton.when_near is not None and carton.until_s is not None:
        page.report(pairs["until"][0], '"until" does not go with "when near".', "Write stays: 90 s.")
    elif carton.when_near is None and carton.stays_s is not None:
        page.report(pairs["stays"][0], '"stays" goes with "when near" only.', "Write until: 10 min.")
    elif carton.until_s is not None and carton.until_s <= carton.from_s:
        page.report(pairs["until"][1], "This carton is gone before it is there.", 'Write a time later than "from".')


def _read_door_change(page: Page, node: Node, site: Site) -> DoorChange:
    body = mapping(page, node, "a door", "{shut: pharmacy door, at: 5 min}")
    if body is None:
        return DoorChange("", 0.0, open=True)
    fields = Fields(page, body, "a door", DOOR_KEYS)
    verbs = [verb for verb in body.pairs if verb in ("shut", "open")]
    if len(verbs) != 1:
        page.report(body, "A door is either shut or opened.", "Write for example shut: pharmacy door")
        return DoorChange("", 0.0, open=True)
    names = [door.name for door in site.doors]
    door = _known(page, body.pairs[verbs[0]][1], names, "door", DOOR_KEYS["shut"])
    return DoorChange(door, fields.number_or("at", TIME, 0.0), open=verbs[0] == "open")


def _read_walkers(page: Page, node: Node, site: Site) -> Walkers:
    body = mapping(page, node, "walkers", "{count: 4}")
    if body is None:
        return ONE_WALKER
    fields = Fields(page, body, "a group of walkers", WALKER_KEYS)
    names = [place.name for place in site.places]
    between = fields.get("between")
    ends = [] if between is None else items(page, between, '"between"', WALKER_KEYS["between"])
    if between is not None and len(ends) == 1:
        page.report(between, "Nobody walks between one place.", "Name two places or more, or leave the key out.")
    speed, deviation = fields.get("speed"), fields.get("speed deviation")
    return Walkers(
        count=fields.count("count", COUNT),
        speed_mean=ONE_WALKER.speed_mean if speed is None else amount(page, speed, WALKING, WALKER_KEYS["speed"]),
        speed_deviation=(
            ONE_WALKER.speed_deviation
            if deviation is None
            else amount(page, deviation, DEVIATION, WALKER_KEYS["speed deviation"])
        ),
        between=tuple(_known(page, end, names, "place", "ward east") for end in ends),
    )


def _known(page: Page, node: Node, names: list[str], kind: str, example: str) -> str:
    """A name of the site; '' after a report."""
    text = page.text(node, f"a {kind}", example)
    if text is None or text in names:
        return text or ""
    page.report(node, f"There is no {kind} called {quoted(text)}.", nearest(text, names, kind))
    return ""
