"""What conditions let go wrong with the robot, at a time or by rate."""

from __future__ import annotations

from collections.abc import Sequence

from runner.language.conditions_people import read_when
from runner.language.diagnostics import nearest, quoted
from runner.language.fields import Fields, Keys, known, mapping
from runner.language.geometry import Coordinates, read_point
from runner.language.nodes import Node, Scalar
from runner.language.pages import Page
from runner.language.phrases import parse_facing
from runner.language.quantities import DURATION, SHARE, Amount, PhraseError
from runner.site.values import Fault, FaultKind, Pose, Site

LASTS = Amount("The time a fault lasts", DURATION, "1 s", "24 h")
SLIP = Amount("The slip", SHARE, "1 %", "100 %")
FAULT_KEYS: Keys = {
    "fault": "wheels stuck",
    "for": "20 s",
    "at": "5 min",
    "rate": "1/h",
    "slip": "40 %",
    "to": "ward east",
    "facing": "90 deg",
}
OWN_KEYS: dict[str, FaultKind] = {"slip": FaultKind.SLIP, "to": FaultKind.CARRIED, "facing": FaultKind.CARRIED}
"""Keys that go with one kind of fault only."""
STUCK = Fault(FaultKind.WHEELS_STUCK, at_s=0.0)


def read_fault(page: Page, node: Node, site: Site, coordinates: Coordinates) -> Fault:
    """One fault; one that must not be used after a report."""
    body = mapping(page, node, "a fault", "{fault: wheels stuck, for: 20 s, at: 5 min}")
    if body is None:
        return STUCK
    fields = Fields(page, body, "a fault", FAULT_KEYS)
    kind = fields.phrase("fault", _parse_kind, None) if fields.need("fault") is not None else None
    at_s, per_hour = read_when(fields)
    if kind is None:
        return STUCK
    _check_keys(fields, kind)
    carried = kind is FaultKind.CARRIED
    return Fault(
        kind,
        for_s=0.0 if carried else fields.number("for", LASTS),
        at_s=at_s,
        per_hour=per_hour,
        slip=fields.number("slip", SLIP) if kind is FaultKind.SLIP else 0.0,
        to=_read_destination(fields, site, coordinates) if carried else None,
    )


def _parse_kind(text: str) -> FaultKind | None:
    words = [kind.value for kind in FaultKind]
    if text not in words:
        help_text = nearest(text, words, "fault")
        raise PhraseError(0, len(text), f"There is no fault called {quoted(text)}.", help_text)
    return FaultKind(text)


def _check_keys(fields: Fields, kind: FaultKind) -> None:
    pairs = fields.mapping.pairs
    for key, owner in OWN_KEYS.items():
        if key in pairs and kind is not owner:
            fields.page.report(pairs[key][0], f"{quoted(key)} goes with the fault {owner.value} only.", "Leave it out.")
    if kind is FaultKind.CARRIED and "for" in pairs:
        fields.page.report(pairs["for"][0], "A robot that was carried stays where it is put.", 'Leave "for" out.')


def _read_destination(fields: Fields, site: Site, coordinates: Coordinates) -> Pose | None:
    """A place or a point with a facing; None for anywhere."""
    node = fields.get("to")
    if node is None:
        return None
    if isinstance(node, Scalar):
        return _place(fields, node, site)
    point = read_point(fields.page, node, coordinates)
    return None if point is None else Pose(*point, fields.phrase("facing", parse_facing, 0.0))


def _place(fields: Fields, node: Node, site: Site) -> Pose | None:
    names: Sequence[str] = [place.name for place in site.places]
    place = site.place(known(fields.page, node, list(names), "place", FAULT_KEYS["to"]))
    return None if place is None else place.pose
