"""What conditions put on the floor: cartons, clutter at random, furniture that is not where the map has it."""

from __future__ import annotations

from collections.abc import Iterable

from runner.language.diagnostics import quoted
from runner.language.fields import Fields, Keys, mapping
from runner.language.geometry import ORIGIN, Coordinates, read_point, rectangle
from runner.language.nodes import Node
from runner.language.pages import Page
from runner.language.phrases import parse_size, parse_span
from runner.language.quantities import DURATION, FREQUENCY, LENGTH, SHARE, Amount, PhraseError
from runner.site.values import Carton, Clutter, Point, Site, Solid

SIDE = Amount("A side of a carton", LENGTH, "5 cm", "5 m")
TIME = Amount("A time since the beginning", DURATION, "0 s", "168 h")
NEAR = Amount("The distance to the robot", LENGTH, "0.5 m", "50 m")
STAYS = Amount("The time it stays", DURATION, "1 s", "168 h")
OFTEN = Amount("How often this happens", FREQUENCY, "0.1/d", "600/h")
LOW_SHARE = Amount("The share of low things", SHARE, "0 %", "100 %")
MOVED_SHARE = Amount("The share of things that are moved", SHARE, "0 %", "100 %")

CARTON_KEYS: Keys = {
    "at": "[20 m, 12 m]",
    "size": "60 cm x 40 cm",
    "from": "2 min",
    "until": "10 min",
    "when near": "3 m",
    "stays": "90 s",
    "low": "yes",
}
CLUTTER_KEYS: Keys = {
    "rate": "6/h",
    "stays": "10 min",
    "sides": "30 cm to 60 cm",
    "low": "30 %",
    "moved": "20 %",
    "hours": "[07:00-19:00]",
}
FURNITURE_KEYS: Keys = {
    "missing": "[20 m, 12 m]",
    "moved": "[20 m, 12 m]",
    "by": "[50 cm, 0 cm]",
    "extra": "[20 m, 12 m]",
    "size": "60 cm x 40 cm",
}
ONE_CLUTTER = Clutter(1.0)
YES_OR_NO = {"yes": True, "no": False}


def read_carton(page: Page, node: Node, site: Site, coordinates: Coordinates) -> Carton:
    """One carton; one that must not be used after a report."""
    body = mapping(page, node, "a carton", "{at: [20 m, 12 m], size: 60 cm x 40 cm}")
    if body is None:
        return Carton(ORIGIN, (SIDE.least, SIDE.least))
    fields = Fields(page, body, "a carton", CARTON_KEYS)
    from_s, until_s, when_near, stays_s = read_times(fields, "This carton")
    return Carton(
        at=read_spot(fields, "at", site, coordinates, "This carton"),
        size=_read_size(fields),
        from_s=from_s,
        until_s=until_s,
        when_near=when_near,
        stays_s=stays_s,
        low=fields.phrase("low", _parse_yes, False),
    )


def read_spot(fields: Fields, key: str, site: Site, coordinates: Coordinates, what: str) -> Point:
    """A point on the floor at a key that must be there."""
    node = fields.need(key)
    point = None if node is None else read_point(fields.page, node, coordinates)
    if node is None or point is None:
        return ORIGIN
    if not (0.0 <= point[0] <= site.width and 0.0 <= point[1] <= site.height):
        help_text = f"The floor of {quoted(site.name)} is {site.width:g} m x {site.height:g} m from 0, 0."
        fields.page.report(node, f"{what} lies beyond the floor.", help_text)
    return point


def read_times(fields: Fields, what: str) -> tuple[float, float | None, float | None, float | None]:
    """`from`, `until`, `when near` and `stays`: when something is there, in seconds, and how near the robot then is.

    `until` ends what begins with `from`, `stays` what begins with `when near`; each goes with its own.
    """
    near, until, stays = fields.get("when near"), fields.get("until"), fields.get("stays")
    from_s = fields.number_or("from", TIME, 0.0)
    until_s = None if until is None else fields.number("until", TIME)
    when_near = None if near is None else fields.number("when near", NEAR)
    stays_s = None if stays is None else fields.number("stays", STAYS)
    pairs, page = fields.mapping.pairs, fields.page
    if when_near is not None and until_s is not None:
        page.report(pairs["until"][0], '"until" does not go with "when near".', "Write stays: 90 s.")
    elif when_near is None and stays_s is not None:
        page.report(pairs["stays"][0], '"stays" goes with "when near" only.', "Write until: 10 min.")
    elif until_s is not None and until_s <= from_s:
        page.report(pairs["until"][1], f"{what} is gone before it is there.", 'Write a time later than "from".')
    return from_s, until_s, when_near, stays_s


def read_clutter(page: Page, node: Node) -> Clutter:
    """One kind of clutter; one that must not be used after a report."""
    body = mapping(page, node, "clutter", "{rate: 6/h, stays: 10 min}")
    if body is None:
        return ONE_CLUTTER
    fields = Fields(page, body, "clutter", CLUTTER_KEYS)
    return Clutter(
        per_hour=fields.number("rate", OFTEN),
        stays_s=fields.number_or("stays", STAYS, ONE_CLUTTER.stays_s),
        sides=fields.phrase("sides", _parse_sides, ONE_CLUTTER.sides),
        low=fields.number_or("low", LOW_SHARE, ONE_CLUTTER.low),
        moved=fields.number_or("moved", MOVED_SHARE, ONE_CLUTTER.moved),
        hours=tuple(page.phrase(one, parse_span, (0.0, 0.0), "hours", "07:00-19:00") for one in fields.items("hours")),
    )


def read_furniture(
    page: Page, nodes: Iterable[Node], site: Site, coordinates: Coordinates
) -> tuple[tuple[Solid, ...], tuple[Solid, ...]]:
    """The solids of the site that are not there, and those that are there and not on the site."""
    missing: list[Solid] = []
    extra: list[Solid] = []
    for node in nodes:
        body = mapping(page, node, "furniture", "{missing: [20 m, 12 m]}")
        if body is None:
            continue
        fields = Fields(page, body, "a piece of furniture", FURNITURE_KEYS)
        verbs = [verb for verb in body.pairs if verb in ("missing", "moved", "extra")]
        if len(verbs) != 1:
            page.report(body, "Furniture is either missing, moved or extra.", "Write for example missing: [20 m, 12 m]")
            continue
        spot = read_spot(fields, verbs[0], site, coordinates, "This piece of furniture")
        if verbs[0] == "extra":
            extra.append(Solid(_corners(spot, _read_size(fields))))
        elif (solid := _solid_at(page, body.pairs[verbs[0]][1], spot, site)) is not None:
            missing.append(solid)
            if verbs[0] == "moved":
                extra.append(_shifted(solid, _read_shift(fields, coordinates)))
    return tuple(missing), tuple(extra)


def _solid_at(page: Page, node: Node, spot: Point, site: Site) -> Solid | None:
    """The site's solid that covers a point; None after a report."""
    for solid in site.solids:
        if _holds(solid.corners, spot):
            return solid
    page.report(node, "The site has no solid here.", 'Name a point inside one of its "solids".')
    return None


def _holds(corners: tuple[Point, ...], spot: Point) -> bool:
    """Whether a polygon holds a point (even-odd rule)."""
    x, y = spot
    inside = False
    for (x1, y1), (x2, y2) in zip(corners, corners[1:] + corners[:1], strict=True):
        if (y1 > y) != (y2 > y) and x < x1 + (y - y1) / (y2 - y1) * (x2 - x1):
            inside = not inside
    return inside


def _read_shift(fields: Fields, coordinates: Coordinates) -> Point:
    node = fields.need("by")
    shift = None if node is None else read_point(fields.page, node, coordinates)
    return ORIGIN if shift is None else shift


def _shifted(solid: Solid, by: Point) -> Solid:
    return Solid(tuple((x + by[0], y + by[1]) for x, y in solid.corners))


def _corners(middle: Point, size: Point) -> tuple[Point, ...]:
    (x, y), (width, height) = middle, size
    return rectangle((x - width / 2.0, y - height / 2.0), (x + width / 2.0, y + height / 2.0))


def _read_size(fields: Fields) -> tuple[float, float]:
    size: tuple[float, float] = (SIDE.least, SIDE.least)
    node = fields.need("size")
    return size if node is None else fields.page.phrase(node, _parse_size, size, "a size", CARTON_KEYS["size"])


def _parse_size(text: str) -> tuple[float, float]:
    """`60 cm x 40 cm`, or one length for a square."""
    try:
        side = SIDE.read(text)
    except PhraseError:
        if " x " not in text:
            raise
        return parse_size(text, SIDE)
    return side, side


def _parse_sides(text: str) -> tuple[float, float]:
    """`30 cm to 60 cm`: the shortest and the longest side."""
    parts = text.split(" to ")
    if len(parts) != 2:
        raise PhraseError(0, len(text), "Sides are two lengths with a to between.", "Write for example 30 cm to 60 cm.")
    shortest, longest = (SIDE.read(part.strip()) for part in parts)
    if longest < shortest:
        raise PhraseError(0, len(text), "The longest side comes last.", f"Write {parts[1]} to {parts[0]}.")
    return shortest, longest


def _parse_yes(text: str) -> bool:
    if text not in YES_OR_NO:
        raise PhraseError(0, len(text), f"This is yes or no, not {quoted(text)}.", "Write yes or no.")
    return YES_OR_NO[text]
