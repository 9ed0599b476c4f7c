"""Mission files: the keys at the top, the retry rules, the limits, and the files of the site and the robot."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from runner.language.diagnostics import quoted
from runner.language.fields import Fields, Keys, mapping
from runner.language.mission import Limits, Mission, RetryRule, Step
from runner.language.nodes import Node
from runner.language.pages import Page, Reading
from runner.language.quantities import SPEED, Amount, parse_clock
from runner.language.robot_file import read_robot_page
from runner.language.rules import DEFAULT_RULE, read_rule
from runner.language.site_file import read_site_page
from runner.language.steps import NOWHERE, Scope, read_place, read_steps
from runner.site.values import RobotDescription, Site

SPEED_LIMIT = Amount("The speed limit", SPEED, "0.05 m/s", "3 m/s")

MISSION_KEYS: Keys = {
    "mission": "Evening round",
    "site": "sites/harbour-clinic.yaml",
    "robot": "robots/small-cart.yaml",
    "start": "charging bay",
    "retry rules": "{patient: {tries: 3}}",
    "limits": "{speed: 0.8 m/s, end by: 06:00}",
    "steps": "[go: ward east]",
}
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
    rules = _read_rules(fields)
    places = None if ground.site is None else {place.name: place for place in ground.site.places}
    scope = Scope(page, places, {DEFAULT_RULE.name: DEFAULT_RULE, **rules})
    start_node, steps_node = fields.need("start"), fields.need("steps")
    start = NOWHERE if start_node is None else read_place(scope, start_node)
    start_mark = page.mark(page.root if start_node is None else start_node)
    limits = _read_limits(fields)
    steps: tuple[Step, ...] = () if steps_node is None else read_steps(scope, steps_node)
    if ground.site is None or ground.robot is None:
        return None
    kept = tuple(scope.rules.values())
    return Mission(name, ground.site, ground.robot, start, start_mark, limits, kept, steps, tuple(page.reading.sources))


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


def _read_rules(fields: Fields) -> dict[str, RetryRule]:
    return {key.text: read_rule(fields.page, key, node) for key, node in fields.pairs("retry rules")}


def _read_limits(fields: Fields) -> Limits:
    node = fields.get("limits")
    body = None if node is None else mapping(fields.page, node, quoted("limits"), MISSION_KEYS["limits"])
    if body is None:
        return Limits()
    inner = Fields(fields.page, body, "limits", LIMIT_KEYS)
    speed = None if inner.get("speed") is None else inner.number("speed", SPEED_LIMIT)
    end_by = None if inner.get("end by") is None else inner.phrase("end by", parse_clock, 0.0)
    return Limits(speed, end_by)
