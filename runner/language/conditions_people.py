"""What conditions say of people: walkers, when they are about, bystanders and crowds."""

from __future__ import annotations

from runner.language.conditions_things import OFTEN, STAYS, TIME, read_spot, read_times
from runner.language.fields import Fields, Keys, amount, items, known, mapping
from runner.language.geometry import ORIGIN, Coordinates
from runner.language.nodes import Node
from runner.language.pages import Page
from runner.language.phrases import parse_span
from runner.language.quantities import SHARE, SPEED, Amount, Count
from runner.site.values import AboutShare, Bystander, Crowd, Site, Walkers

COUNT = Count("The number of walkers", 1, 200)
TOGETHER = Count("The number who walk together", 1, 20)
CROWD = Count("The number of people in a crowd", 1, 40)
WALKING = Amount("The walking speed", SPEED, "0.1 m/s", "3 m/s")
DEVIATION = Amount("The spread of walking speeds", SPEED, "0 m/s", "1 m/s")
ABOUT = Amount("The share of people about", SHARE, "0 %", "100 %")

WALKER_KEYS: Keys = {
    "count": "4",
    "together": "2",
    "between": "[ward east, kitchen]",
    "speed": "1.3 m/s",
    "speed deviation": "0.26 m/s",
}
BYSTANDER_KEYS: Keys = {
    "at": "[20 m, 12 m]",
    "from": "2 min",
    "until": "10 min",
    "when near": "3 m",
    "stays": "90 s",
}
CROWD_KEYS: Keys = {"count": "6", "at": "5 min", "rate": "2/h", "stays": "40 s"}
ONE_WALKER = Walkers(1)


def read_walkers(page: Page, node: Node, site: Site) -> Walkers:
    """One group of walkers; one that must not be used after a report."""
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
        together=ONE_WALKER.together if fields.get("together") is None else fields.count("together", TOGETHER),
        speed_mean=ONE_WALKER.speed_mean if speed is None else amount(page, speed, WALKING, WALKER_KEYS["speed"]),
        speed_deviation=(
            ONE_WALKER.speed_deviation
            if deviation is None
            else amount(page, deviation, DEVIATION, WALKER_KEYS["speed deviation"])
        ),
        between=tuple(known(page, end, names, "place", "ward east") for end in ends),
    )


def read_about(fields: Fields) -> tuple[AboutShare, ...]:
    """The share of walkers who are about, by hours."""
    page = fields.page
    return tuple(
        AboutShare(
            *page.phrase(hours, parse_span, (0.0, 0.0), "hours", "22:00-06:00"), amount(page, share, ABOUT, "10 %")
        )
        for hours, share in fields.pairs("people about")
    )


def read_bystander(page: Page, node: Node, site: Site, coordinates: Coordinates) -> Bystander:
    """Somebody who stands; one that must not be used after a report."""
    body = mapping(page, node, "a bystander", "{at: [20 m, 12 m], from: 2 min, until: 4 min}")
    if body is None:
        return Bystander(ORIGIN)
    fields = Fields(page, body, "a bystander", BYSTANDER_KEYS)
    spot = read_spot(fields, "at", site, coordinates, "This bystander")
    return Bystander(spot, *read_times(fields, "This bystander"))


def read_crowd(page: Page, node: Node, site: Site) -> Crowd:
    """A crowd; one that must not be used after a report."""
    body = mapping(page, node, "a crowd", "{count: 6, at: 5 min, stays: 40 s}")
    if body is None:
        return Crowd(1, STAYS.least)
    if not site.places:
        page.report(node, "A crowd needs places to come from, and the site has none.", "Give the site a place.")
    fields = Fields(page, body, "a crowd", CROWD_KEYS)
    at_s, per_hour = read_when(fields)
    return Crowd(fields.count("count", CROWD), fields.number("stays", STAYS), at_s, per_hour)


def read_when(fields: Fields) -> tuple[float | None, float | None]:
    """`at` or `rate`, one of them: seconds since the beginning, or times an hour."""
    given = [key for key in ("at", "rate") if fields.get(key) is not None]
    if len(given) != 1:
        sentence = f"{fields.what.capitalize()} comes at a time, or at a rate."
        fields.page.report(fields.mapping, sentence, "Write at: 5 min, or rate: 2/h.")
        return 0.0, None
    if given == ["at"]:
        return fields.number("at", TIME), None
    return None, fields.number("rate", OFTEN)
