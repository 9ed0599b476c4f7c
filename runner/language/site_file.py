"""Site files: floor, walls, solids, doors and places. The format is written down in FILES.md."""

from __future__ import annotations

import math
from dataclasses import dataclass

from runner.language.diagnostics import nearest, quoted
from runner.language.drawing import Drawn, read_drawing
from runner.language.fields import Fields, Keys, mapping, name
from runner.language.geometry import (
    ORIGIN,
    Coordinates,
    polygon_area,
    read_coordinates,
    read_point,
    read_points,
    rectangle,
)
from runner.language.nodes import Mapping, Node, Scalar, Sequence
from runner.language.pages import Page
from runner.language.phrases import parse_facing, parse_size, parse_span
from runner.language.quantities import LENGTH, Amount
from runner.site.values import Door, Place, Point, Pose, Site, Solid, Wall

SIDE = Amount("A side of the floor", LENGTH, "1 m", "500 m")
THICKNESS = Amount("The thickness of a wall", LENGTH, "1 cm", "2 m")
THICKNESS_DEFAULT = 0.15  # meters; a plaster wall on studs
DOOR_LEAST, DOOR_MOST = 0.3, 20.0  # meters; a cat flap, a hangar
EDGE_SLACK = 1e-6  # meters; a point on the edge lies on the floor whatever the rounding

SITE_KEYS: Keys = {
    "site": "Harbour clinic",
    "floor": "45 m x 25 m",
    "coordinates": "in meters",
    "time zone": "Europe/Berlin",
    "wall thickness": "15 cm",
    "walls": "[[[0 m, 0 m], [45 m, 0 m]]]",
    "solids": "[{rectangle: [[2 m, 2 m], [3 m, 4 m]]}]",
    "doors": "{ward door: {from: [4 m, 14 m], to: [5.2 m, 14 m]}}",
    "places": "{charging bay: {at: [2 m, 12 m], facing: east}}",
    "square": "50 cm",
    "drawing": "|",
    "legend": "{a: {place: kitchen, facing: west}}",
}
WALL_KEYS: Keys = {"line": "[[0 m, 0 m], [9 m, 0 m]]", "room": "[[0 m, 0 m], [4 m, 5 m]]", "thickness": "15 cm"}
SOLID_KEYS: Keys = {
    "rectangle": "[[2 m, 2 m], [3 m, 4 m]]",
    "polygon": "[[5 m, 5 m], [7 m, 5 m], [6 m, 7 m]]",
}
DOOR_KEYS: Keys = {"from": "[4 m, 14 m]", "to": "[5.2 m, 14 m]", "shut": "[22:00-06:00]"}
PLACE_KEYS: Keys = {"at": "[2 m, 12 m]", "facing": "east"}


@dataclass(frozen=True, slots=True)
class Plan:
    """What the readers of a site's lists need to know of the whole."""

    page: Page
    coordinates: Coordinates
    thickness: float
    width: float
    height: float

    def on_floor(self, point: Point) -> bool:
        """Whether a point lies on the floor, edge included."""
        x, y = point
        return -EDGE_SLACK <= x <= self.width + EDGE_SLACK and -EDGE_SLACK <= y <= self.height + EDGE_SLACK

    def check(self, node: Node, what: str, points: tuple[Point, ...]) -> None:
        """Reports the first point beyond the floor."""
        for x, y in points:
            if not self.on_floor((x, y)):
                sentence = f"{what} lies beyond the floor, at {x:g} m, {y:g} m."
                self.page.report(node, sentence, f"The floor is {self.width:g} m x {self.height:g} m from 0, 0.")
                return


def read_site_page(page: Page) -> Site | None:
    """The site of a page; None, or one that must not be used, after a report."""
    if page.root is None:
        return None
    fields = Fields(page, page.root, "a site", SITE_KEYS)
    site_name = fields.name("site")
    drawn = read_drawing(page, fields)
    width, height = (drawn.width, drawn.height) if drawn is not None else _read_size(fields)
    thickness = fields.number_or("wall thickness", THICKNESS, THICKNESS_DEFAULT)
    plan = Plan(page, read_coordinates(fields), thickness, width, height)
    drawn = drawn or Drawn(width, height)
    walls = tuple(wall for node in fields.items("walls") if (wall := _read_wall(plan, node)) is not None)
    solids = tuple(solid for node in fields.items("solids") if (solid := _read_solid(plan, node)) is not None)
    doors = [*drawn.doors, *_read_doors(plan, fields, {door.name for door in drawn.doors})]
    places = [*drawn.places, *_read_places(plan, fields, {place.name for place in drawn.places})]
    if not places and "legend" not in page.root.pairs:
        fields.need("places")
    zone = _read_time_zone(fields)
    return Site(site_name, width, height, walls, (*drawn.solids, *solids), tuple(doors), tuple(places), zone)


def _read_time_zone(fields: Fields) -> str | None:
    """A time zone this computer knows; None where nothing is written, or after a report."""
    node = fields.get("time zone")
    text = None if node is None else fields.page.text(node, "a time zone", SITE_KEYS["time zone"])
    if node is None or text is None:
        return None
    from zoneinfo import ZoneInfo, available_timezones

    try:
        return ZoneInfo(text).key
    except (OSError, ValueError, LookupError):
        help_text = nearest(text, sorted(available_timezones()), "time zone")
        fields.page.report(node, f"There is no time zone called {quoted(text)}.", help_text)
        return None


def _read_size(fields: Fields) -> tuple[float, float]:
    node = fields.need("floor")
    if node is None:
        return SIDE.most, SIDE.most
    stand_in = (SIDE.most, SIDE.most)
    return fields.page.phrase(node, lambda text: parse_size(text, SIDE), stand_in, "a size", SITE_KEYS["floor"])


def _read_wall(plan: Plan, node: Node) -> Wall | None:
    if isinstance(node, Sequence):
        return _wall_along(plan, node, plan.thickness)
    body = mapping(plan.page, node, "a wall", "{room: [[0 m, 0 m], [4 m, 5 m]]}")
    if body is None:
        return None
    fields = Fields(plan.page, body, "a wall", WALL_KEYS)
    thickness = fields.number_or("thickness", THICKNESS, plan.thickness)
    shape = _one_shape(fields, ("line", "room"))
    if shape is None:
        return None
    if shape == "line":
        return _wall_along(plan, body.pairs["line"][1], thickness)
    corners = _read_box(plan, body.pairs["room"][1], "A room")
    return Wall((*corners, corners[0]), thickness) if corners else None


def _wall_along(plan: Plan, node: Node, thickness: float) -> Wall | None:
    points = read_points(plan.page, node, plan.coordinates, 2, "a wall")
    plan.check(node, "This wall", points)
    return Wall(points, thickness) if points else None


def _read_solid(plan: Plan, node: Node) -> Solid | None:
    body = mapping(plan.page, node, "a solid", "{rectangle: [[2 m, 2 m], [3 m, 4 m]]}")
    if body is None:
        return None
    fields = Fields(plan.page, body, "a solid", SOLID_KEYS)
    shape = _one_shape(fields, ("rectangle", "polygon"))
    if shape is None:
        return None
    value = body.pairs[shape][1]
    if shape == "rectangle":
        corners = _read_box(plan, value, "A rectangle")
        return Solid(corners) if corners else None
    corners = read_points(plan.page, value, plan.coordinates, 3, "a polygon")
    if corners and polygon_area(corners) == 0.0:
        plan.page.report(value, "This polygon encloses nothing.", "List its corners in order, around the shape.")
    plan.check(value, "This polygon", corners)
    return Solid(corners) if corners else None


def _one_shape(fields: Fields, shapes: tuple[str, str]) -> str | None:
    """Which of two keys is there, or None after a report of neither or both."""
    there = [shape for shape in fields.mapping.pairs if shape in shapes]
    if len(there) == 1:
        return there[0]
    if not fields.mistaken.isdisjoint(shapes):
        return None
    sentence = f"{fields.what.capitalize()} is either {shapes[0]} or {shapes[1]}."
    help_text = f"Write for example {shapes[0]}: {fields.keys[shapes[0]]}"
    fields.page.report(fields.mapping, sentence, help_text)
    return None


def _read_box(plan: Plan, node: Node, what: str) -> tuple[Point, ...]:
    """The corners of an upright rectangle given by two opposite ones; none after a report."""
    points = read_points(plan.page, node, plan.coordinates, 2, what.lower())
    if not points:
        return ()
    if len(points) != 2 or points[0][0] == points[1][0] or points[0][1] == points[1][1]:
        sentence = f"{what} lies between two opposite corners."
        plan.page.report(node, sentence, "Write [[left, low], [right, high]].")
        return ()
    plan.check(node, "This " + what.split()[1], points)
    return rectangle(points[0], points[1])


def _read_doors(plan: Plan, fields: Fields, taken: set[str]) -> list[Door]:
    doors = []
    for key, node in fields.pairs("doors"):
        door_name = _new_name(plan.page, key, "door", taken)
        body = mapping(plan.page, node, f"the door {quoted(key.text)}", "{from: [4 m, 14 m], to: [5.2 m, 14 m]}")
        if body is not None:
            doors.append(_read_door(plan, door_name, body))
    return doors


def _read_door(plan: Plan, door_name: str, body: Mapping) -> Door:
    fields = Fields(plan.page, body, "a door", DOOR_KEYS)
    start, end = _read_end(plan, fields, "from"), _read_end(plan, fields, "to")
    hours = read_hours(fields)
    if start is None or end is None:
        return Door(door_name, ORIGIN, ORIGIN, plan.thickness, hours)
    width = math.dist(start, end)
    if not DOOR_LEAST <= width <= DOOR_MOST:
        sentence = f"This door is {width:.3g} m wide."
        plan.page.report(body, sentence, f"Doors are {DOOR_LEAST:g} m to {DOOR_MOST:g} m wide; check its two ends.")
    return Door(door_name, start, end, plan.thickness, hours)


def _read_end(plan: Plan, fields: Fields, key: str) -> Point | None:
    node = fields.need(key)
    point = None if node is None else read_point(plan.page, node, plan.coordinates)
    if node is not None and point is not None:
        plan.check(node, "This end of the door", (point,))
    return point


def read_hours(fields: Fields) -> tuple[tuple[float, float], ...]:
    """The hours at which a door is shut."""
    page = fields.page
    return tuple(page.phrase(node, parse_span, (0.0, 0.0), "hours", "22:00-06:00") for node in fields.items("shut"))


def _read_places(plan: Plan, fields: Fields, taken: set[str]) -> list[Place]:
    places = []
    for key, node in fields.pairs("places"):
        place_name = _new_name(plan.page, key, "place", taken)
        body = mapping(plan.page, node, f"the place {quoted(key.text)}", "{at: [2 m, 12 m], facing: east}")
        if body is not None:
            inner = Fields(plan.page, body, "a place", PLACE_KEYS)
            places.append(Place(place_name, _read_pose(plan, inner)))
    return places


def _read_pose(plan: Plan, fields: Fields) -> Pose:
    node = fields.need("at")
    point = None if node is None else read_point(plan.page, node, plan.coordinates)
    if node is not None and point is not None:
        plan.check(node, "This place", (point,))
    x, y = point or ORIGIN
    facing = fields.need("facing")
    heading = 0.0 if facing is None else fields.phrase("facing", parse_facing, 0.0)
    return Pose(x, y, heading)


def _new_name(page: Page, key: Scalar, kind: str, taken: set[str]) -> str:
    """A name that the drawing has not given already."""
    text = name(page, key, "ward east")
    if text in taken:
        page.report(key, f"A {kind} called {quoted(text)} is in the drawing already.", "Choose another name.")
    return text
