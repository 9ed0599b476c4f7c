"""Coordinates in files: pairs with units, or bare where the file says once what they are in."""

from __future__ import annotations

from collections.abc import Sequence as Ordered
from itertools import pairwise

from runner.language.diagnostics import nearest, quoted
from runner.language.fields import Fields
from runner.language.nodes import Node, Scalar, Sequence
from runner.language.pages import Page
from runner.language.quantities import LENGTH, PhraseError, parse_number, parse_quantity
from runner.site.values import Point

SCALES = {"in meters": 1.0, "in centimeters": 0.01, "in millimeters": 0.001}
"""What `coordinates:` may say, and the factor to meters."""


class Coordinates:
    """What a file's bare coordinates are in: `scale` meters a unit, None where the file does not say."""

    def __init__(self, scale: float | None) -> None:
        self.scale = scale
        self._told = False

    def bare(self, page: Page, node: Node, number: float) -> float | None:
        """A bare coordinate in meters; None where it needs a unit, which is reported once for the whole file."""
        if self.scale is not None:
            return number * self.scale
        if not self._told:
            help_text = f"Write {number:g} m, or once for the whole file: coordinates: in meters"
            page.report(node, "This coordinate has no unit.", help_text)
        self._told = True
        return None


ORIGIN: Point = (0.0, 0.0)


def read_coordinates(fields: Fields) -> Coordinates:
    """What the key `coordinates` says."""
    node = fields.get("coordinates")
    if node is None:
        return Coordinates(None)
    text = fields.page.text(node, "the unit of coordinates", "in meters")
    if text is not None and text not in SCALES:
        sentence = f"Coordinates cannot be {quoted(text)}."
        fields.page.report(node, sentence, nearest(text, SCALES, "wording"))
    return Coordinates(SCALES.get(text or "", 1.0))


def read_point(page: Page, node: Node, coordinates: Coordinates) -> Point | None:
    """A pair of coordinates in meters, or None after a report."""
    if not isinstance(node, Sequence) or len(node.items) != 2:
        page.report(node, "A point is a pair, x and y.", "Write for example [12.5 m, 3 m].")
        return None
    x, y = (_read_coordinate(page, item, coordinates) for item in node.items)
    return None if x is None or y is None else (x, y)


def read_points(page: Page, node: Node, coordinates: Coordinates, least: int, what: str) -> tuple[Point, ...]:
    """A list of points in meters, of at least so many; none after a report."""
    if not isinstance(node, Sequence):
        page.report(node, f"A list of points is meant for {what}.", "Write for example [[0 m, 0 m], [2 m, 0 m]].")
        return ()
    if len(node.items) < least:
        help_text = f"Write {least} or more, as [[x, y], [x, y]]."
        page.report(node, f"There are too few points for {what}: {len(node.items)}.", help_text)
        return ()
    points = [read_point(page, item, coordinates) for item in node.items]
    return tuple(point for point in points if point is not None) if None not in points else ()


def rectangle(one: Point, other: Point) -> tuple[Point, ...]:
    """The four corners of an upright rectangle between two opposite ones, counterclockwise."""
    left, right = sorted((one[0], other[0]))
    low, high = sorted((one[1], other[1]))
    return (left, low), (right, low), (right, high), (left, high)


def polygon_area(corners: Ordered[Point]) -> float:
    """Area of a polygon, square meters, by the shoelace formula."""
    outline = [*corners, corners[0]]
    return abs(sum(x1 * y2 - x2 * y1 for (x1, y1), (x2, y2) in pairwise(outline))) / 2.0


def _read_coordinate(page: Page, node: Node, coordinates: Coordinates) -> float | None:
    text = page.text(node, "a coordinate", "12.5 m")
    if text is None or not isinstance(node, Scalar):
        return None
    number = parse_number(text)
    if number is not None:
        return coordinates.bare(page, node, number)
    try:
        return parse_quantity(text, LENGTH)
    except PhraseError as error:
        page.report(node, error.sentence, error.help)
        return None
