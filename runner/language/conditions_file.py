"""Conditions files: what the simulated world does to the robot. The format is written down in FILES.md.

Things on the floor are read in `conditions_things`, people in `conditions_people`, faults in `conditions_faults`.
"""

from __future__ import annotations

from runner.language.conditions_faults import read_fault
from runner.language.conditions_people import read_about, read_bystander, read_crowd, read_walkers
from runner.language.conditions_things import TIME, read_carton, read_clutter, read_furniture
from runner.language.fields import Fields, Keys, known, mapping
from runner.language.geometry import read_coordinates
from runner.language.nodes import Node
from runner.language.pages import Page
from runner.language.quantities import LENGTH, SHARE, Amount, parse_clock
from runner.site.values import Conditions, DoorChange, Site

UNEVEN = Amount("The unevenness of the floor", LENGTH, "0 mm", "50 mm")
SHUTTING = Amount("The share of doors that people shut", SHARE, "0 %", "100 %")
BATTERY = Amount("What the battery holds", SHARE, "1 %", "100 %")

CONDITIONS_KEYS: Keys = {
    "conditions": "Quiet",
    "begins at": "18:00",
    "coordinates": "in meters",
    "battery": "60 %",
    "uneven floor": "5 mm",
    "cartons": "[{at: [20 m, 12 m], size: 60 cm x 40 cm}]",
    "clutter": "[{rate: 6/h, stays: 10 min}]",
    "furniture": "[{missing: [20 m, 12 m]}]",
    "doors": "[{shut: pharmacy door, at: 5 min}]",
    "walkers": "[{count: 4}]",
    "people about": "{22:00-06:00: 10 %}",
    "people shut doors": "30 %",
    "bystanders": "[{at: [20 m, 12 m], from: 2 min, until: 4 min}]",
    "crowds": "[{count: 6, at: 5 min, stays: 40 s}]",
    "faults": "[{fault: wheels stuck, for: 20 s, at: 5 min}]",
}
DOOR_KEYS: Keys = {"shut": "pharmacy door", "open": "pharmacy door", "at": "5 min"}
DEFAULTS = Conditions()


def read_conditions_page(page: Page, site: Site) -> Conditions:
    """The conditions of a page; they must not be used if anything was reported."""
    if page.root is None:
        return DEFAULTS
    fields = Fields(page, page.root, "a conditions file", CONDITIONS_KEYS)
    coordinates = read_coordinates(fields)
    missing, extra = read_furniture(page, fields.items("furniture"), site, coordinates)
    return Conditions(
        name=fields.name("conditions"),
        begins_at=fields.phrase("begins at", parse_clock, DEFAULTS.begins_at),
        battery=fields.number_or("battery", BATTERY, DEFAULTS.battery),
        uneven_floor=fields.number_or("uneven floor", UNEVEN, DEFAULTS.uneven_floor),
        cartons=tuple(read_carton(page, node, site, coordinates) for node in fields.items("cartons")),
        clutter=tuple(read_clutter(page, node) for node in fields.items("clutter")),
        missing=missing,
        extra=extra,
        doors=tuple(_read_door_change(page, node, site) for node in fields.items("doors")),
        walkers=tuple(read_walkers(page, node, site) for node in fields.items("walkers")),
        about=read_about(fields),
        doors_shut_by_people=fields.number_or("people shut doors", SHUTTING, DEFAULTS.doors_shut_by_people),
        bystanders=tuple(read_bystander(page, node, site, coordinates) for node in fields.items("bystanders")),
        crowds=tuple(read_crowd(page, node, site) for node in fields.items("crowds")),
        faults=tuple(read_fault(page, node, site, coordinates) for node in fields.items("faults")),
    )


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
    door = known(page, body.pairs[verbs[0]][1], names, "door", DOOR_KEYS["shut"])
    return DoorChange(door, fields.number_or("at", TIME, 0.0), open=verbs[0] == "open")
