"""Mission files: the keys at the top, the limits, and the files of the site, the robot and what is shared."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

from runner.language.diagnostics import quoted
from runner.language.fields import Fields, Keys, mapping
from runner.language.includes import Shelf, collect
from runner.language.mission import Limits, Mark, Mission, Step
from runner.language.nodes import Node
from runner.language.orders import read_orders, read_prove
from runner.language.pages import Page, Reading
from runner.language.quantities import SPEED, Amount, parse_clock
from runner.language.robot_file import read_robot_page
from runner.language.routines import Library, draft_all
from runner.language.rules import DEFAULT_RULE
from runner.language.scope import NOWHERE, Ledger, Scope, read_place
from runner.language.site_file import read_site_page
from runner.language.steps import read_steps
from runner.site.values import RobotDescription, Site

SPEED_LIMIT = Amount("The speed limit", SPEED, "0.05 m/s", "3 m/s")

MISSION_KEYS: Keys = {
    "mission": "Evening round",
    "site": "sites/harbour-clinic.yaml",
    "robot": "robots/small-cart.yaml",
    "start": "charging bay",
    "include": "[shared.yaml]",
    "silence": "[place-never-visited]",
    "retry rules": "{patient: {tries: 3}}",
    "limits": "{speed: 0.8 m/s, end by: 06:00}",
    "prove": "{legs arrive: 95 %, confidence: 90 %}",
    "standing orders": "[{name: low battery, when: battery < 20 %, do: [go: charging bay]}]",
    "routines": "{hand over: {given: [room], steps: [go: room]}}",
    "steps": "[go: ward east]",
}
_FINDING = re.compile(r"[a-z]+(-[a-z]+)*")
LIMIT_KEYS: Keys = {"speed": "0.8 m/s", "end by": "06:00"}


@dataclass(frozen=True, slots=True)
class Ground:
    """Where a mission takes place and who drives it; None where that could not be read."""

    site: Site | None
    robot: RobotDescription | None


def read_mission_page(page: Page, ground: Ground | None = None) -> Mission | None:
    """The mission of a page, with the files it names, or with `ground` instead of them.

    None, or a mission that must not be used, after a report.
    """
    if page.root is None:
        return None
    fields = Fields(page, page.root, "a mission", MISSION_KEYS)
    name = fields.name("mission")
    site_node, robot_node = fields.need("site"), fields.need("robot")
    if ground is None:
        ground = Ground(_read_site(page, site_node), _read_robot(page, robot_node))
    shelf = Shelf()
    collect(shelf, fields)
    limits = _read_limits(fields)
    scope = _scope(page, ground, shelf, limits, proves="prove" in page.root.pairs)
    start_node, steps_node = fields.need("start"), fields.need("steps")
    start = NOWHERE if start_node is None else read_place(scope, start_node)
    start_mark = page.mark(page.root if start_node is None else start_node)
    prove, silenced = read_prove(fields), _read_silenced(fields)
    draft_all(scope)
    orders = read_orders(scope, fields)
    steps: tuple[Step, ...] = () if steps_node is None else read_steps(scope, steps_node)
    scope.ledger.close()
    if ground.site is None or ground.robot is None:
        return None
    return Mission(
        name=name,
        site=ground.site,
        robot=ground.robot,
        start=start,
        start_mark=start_mark,
        limits=limits,
        rules=tuple(scope.rules.values()),
        steps=steps,
        sources=tuple(page.reading.sources),
        prove=prove,
        orders=orders,
        silenced=silenced,
        routines_unused=_routines_unused(scope.library),
    )


def _routines_unused(library: Library) -> tuple[tuple[str, Mark], ...]:
    used = {name for name, *_ in library.written}
    return tuple(
        (routine.name, routine.page.mark(routine.key))
        for routine in library.routines.values()
        if routine.name not in used
    )


def _scope(page: Page, ground: Ground, shelf: Shelf, limits: Limits, proves: bool) -> Scope:
    return Scope(
        page=page,
        site=ground.site,
        places=None if ground.site is None else {place.name: place for place in ground.site.places},
        rules={DEFAULT_RULE.name: DEFAULT_RULE, **shelf.rules},
        library=Library(shelf.routines),
        ledger=Ledger(),
        read_steps=read_steps,
        endless=limits.end_by is not None,
        proves=proves,
    )


def _read_site(page: Page, node: Node | None) -> Site | None:
    inner = _open_named(page, node, MISSION_KEYS["site"])
    return None if inner is None else read_site_page(inner)


def _read_robot(page: Page, node: Node | None) -> RobotDescription | None:
    inner = _open_named(page, node, MISSION_KEYS["robot"])
    return None if inner is None else read_robot_page(inner)


def _open_named(page: Page, node: Node | None, example: str) -> Page | None:
    """The file whose path is written at a node, seen from the folder of the mission."""
    text = None if node is None else page.text(node, "the path of a file", example)
    if node is None or text is None:
        return None
    reading: Reading = page.reading
    return reading.open(Path(page.file).parent / text, blame=(page, node))


def _read_silenced(fields: Fields) -> tuple[str, ...]:
    """Names of findings, as `trundle check` prints them."""
    found = []
    for node in fields.items("silence"):
        text = fields.page.text(node, "the name of a finding", "place-never-visited")
        if text is not None and not _FINDING.fullmatch(text):
            help_text = "Write it as check prints it, for example place-never-visited."
            fields.page.report(node, f"{quoted(text)} is not the name of a finding.", help_text)
        found.append(text or "")
    return tuple(found)


def _read_limits(fields: Fields) -> Limits:
    node = fields.get("limits")
    body = None if node is None else mapping(fields.page, node, quoted("limits"), MISSION_KEYS["limits"])
    if body is None:
        return Limits()
    inner = Fields(fields.page, body, "limits", LIMIT_KEYS)
    speed = None if inner.get("speed") is None else inner.number("speed", SPEED_LIMIT)
    end_by = None if inner.get("end by") is None else inner.phrase("end by", parse_clock, 0.0)
    return Limits(speed, end_by)
