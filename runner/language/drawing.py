"""A floor drawn with characters: one character a square, `#` for wall, letters and digits explained by a legend."""

from __future__ import annotations

from dataclasses import dataclass

from runner.language.diagnostics import quoted, shown
from runner.language.fields import Fields, Keys, mapping
from runner.language.mission import Mark
from runner.language.nodes import Mapping, Node, Scalar
from runner.language.pages import Page
from runner.language.phrases import parse_facing, parse_span
from runner.language.quantities import LENGTH, Amount
from runner.site.values import Door, Place, Pose, Solid

SQUARE = Amount("The side of a square", LENGTH, "5 cm", "2 m")
SIDE_MOST = 500.0  # meters
WALL, FREE = "#", ". "
LEGEND_KEYS: Keys = {"place": "kitchen", "facing": "west", "door": "kitchen door", "shut": "[20:00-07:00]"}

Square = tuple[int, int]
"""(row, column), row 0 at the top as drawn."""


@dataclass(frozen=True, slots=True)
class Drawn:
    """What a drawing shows. Without a drawing: nothing, on a floor of that size."""

    width: float
    height: float
    solids: tuple[Solid, ...] = ()
    doors: tuple[Door, ...] = ()
    places: tuple[Place, ...] = ()


@dataclass(frozen=True, slots=True)
class _Picture:
    """The lines of a drawing, the side of a square in meters, and where each square stands in the file."""

    page: Page
    node: Scalar
    rows: list[str]
    side: float

    @property
    def width(self) -> float:
        return max(len(row) for row in self.rows) * self.side

    @property
    def height(self) -> float:
        return len(self.rows) * self.side

    def mark(self, square: Square) -> Mark:
        """A literal block stands as it is in the file, below the line that opens it and indented alike."""
        row, column = square
        line = self.node.start.line + 1 + row
        text = self.page.lines()
        indent = len(text[line]) - len(self.rows[row]) if line < len(text) else 0
        return Mark(self.page.file, line + 1, indent + column + 1)

    def at(self, row: int, column: int) -> str:
        """The character of a square; beyond the drawing, free."""
        inside = 0 <= row < len(self.rows) and 0 <= column < len(self.rows[row])
        return self.rows[row][column] if inside else "."

    def x(self, column: float) -> float:
        return round(column * self.side, 6)

    def y(self, row: float) -> float:
        return round((len(self.rows) - row) * self.side, 6)


def read_drawing(page: Page, fields: Fields) -> Drawn | None:
    """What is drawn, or None where the site has no drawing (or none that can be read, after a report)."""
    pairs = fields.mapping.pairs
    if "drawing" not in pairs:
        for key in ("square", "legend"):
            if key in pairs:
                page.report(pairs[key][0], f"{quoted(key)} belongs to a drawing, and there is none.", "Add a drawing.")
        return None
    if "floor" in pairs:
        page.report(pairs["floor"][0], "The drawing gives the size of the floor.", 'Leave "floor" out.')
    picture = _read_picture(page, fields)
    if picture is None:
        return Drawn(SIDE_MOST, SIDE_MOST)
    squares = _squares_of_letters(picture)
    doors, places = _read_legend(picture, fields, squares)
    return Drawn(picture.width, picture.height, tuple(_solids(picture)), tuple(doors), tuple(places))


def _read_picture(page: Page, fields: Fields) -> _Picture | None:
    side = fields.number("square", SQUARE)
    node = fields.get("drawing")
    if not isinstance(node, Scalar) or node.style != "|" or not node.text.strip():
        help_text = "Write `drawing: |` and the lines of the drawing below it, indented alike."
        page.report(fields.mapping.pairs["drawing"][0], "The drawing is a block of text.", help_text)
        return None
    picture = _Picture(page, node, node.text.rstrip("\n").split("\n"), side)
    if max(picture.width, picture.height) > SIDE_MOST:
        sentence = f"The drawing is {picture.width:g} m x {picture.height:g} m."
        page.report(node, sentence, f"Draw at most {SIDE_MOST:g} m, or make the squares smaller.")
        return None
    return picture


def _squares_of_letters(picture: _Picture) -> dict[str, list[Square]]:
    """Where each letter and digit stands; other characters are reported, each once."""
    found: dict[str, list[Square]] = {}
    for row, line in enumerate(picture.rows):
        if line.strip("#. ") == "":
            continue
        for column, character in enumerate(line):
            if character != WALL and character not in FREE:
                found.setdefault(character, []).append((row, column))
    for character in [character for character in found if not character.isalnum()]:
        sentence = f"{quoted(character)} has no meaning in a drawing."
        help_text = "Use # for wall, . for free, letters and digits for what the legend explains."
        picture.page.report(picture.mark(found.pop(character)[0]), sentence, help_text)
    return found


def _read_legend(picture: _Picture, fields: Fields, squares: dict[str, list[Square]]) -> tuple[list[Door], list[Place]]:
    page = picture.page
    doors: list[Door] = []
    places: list[Place] = []
    names: set[tuple[str, str]] = set()
    for key, node in fields.pairs("legend"):
        where = squares.pop(key.text, [])
        if not where:
            page.report(key, f"{quoted(key.text)} is not in the drawing.", "Draw it, or leave its line out.")
            continue
        body = mapping(page, node, f"{quoted(key.text)} of the legend", "{place: kitchen, facing: west}")
        if body is not None:
            _read_entry(picture, body, where, doors, places, names)
    for character, where in squares.items():
        help_text = f"Add for example: {shown(character)}: {{place: kitchen, facing: west}}"
        page.report(picture.mark(where[0]), f"The legend does not explain {quoted(character)}.", help_text)
    return doors, places


def _read_entry(
    picture: _Picture,
    body: Mapping,
    where: list[Square],
    doors: list[Door],
    places: list[Place],
    names: set[tuple[str, str]],
) -> None:
    fields = Fields(picture.page, body, "a line of the legend", LEGEND_KEYS)
    kinds = [kind for kind in body.pairs if kind in ("place", "door")]
    if not kinds and fields.mistaken:
        return
    if len(kinds) != 1:
        help_text = "Write {place: kitchen, facing: west} or {door: kitchen door}."
        picture.page.report(body, "A letter stands for one place or one door.", help_text)
        return
    kind = kinds[0]
    entry_name = fields.name(kind)
    if (kind, entry_name) in names:
        picture.page.report(body.pairs[kind][1], f"There are two {kind}s called {quoted(entry_name)}.", "Rename one.")
    names.add((kind, entry_name))
    if kind == "place":
        places.append(_place(picture, fields, entry_name, where))
    else:
        doors.append(_door(picture, fields, entry_name, where))


def _place(picture: _Picture, fields: Fields, place_name: str, where: list[Square]) -> Place:
    if len(where) > 1:
        sentence = f"{quoted(place_name)} is drawn a second time."
        picture.page.report(picture.mark(where[1]), sentence, "Draw a place once; give each its own letter.")
    row, column = where[0]
    facing: Node | None = fields.need("facing")
    heading = 0.0 if facing is None else fields.phrase("facing", parse_facing, 0.0)
    return Place(place_name, Pose(picture.x(column + 0.5), picture.y(row + 0.5), heading))


def _door(picture: _Picture, fields: Fields, door_name: str, where: list[Square]) -> Door:
    page = picture.page
    hours = tuple(page.phrase(node, parse_span, (0.0, 0.0), "hours", "22:00-06:00") for node in fields.items("shut"))
    rows, columns = [row for row, _ in where], [column for _, column in where]
    low, high, left, right = min(rows), max(rows), min(columns), max(columns)
    lies_flat = right > left or (high == low and _stands_between(picture, low, left))
    if (low != high and left != right) or len(where) != (high - low) + (right - left) + 1:
        sentence = f"The squares of {quoted(door_name)} are not in one straight row."
        page.report(picture.mark(where[1]), sentence, "Give each door its own letter.")
    if lies_flat:
        y = picture.y(low + 0.5)
        return Door(door_name, (picture.x(left), y), (picture.x(right + 1), y), picture.side, hours)
    x = picture.x(left + 0.5)
    return Door(door_name, (x, picture.y(high + 1)), (x, picture.y(low)), picture.side, hours)


def _stands_between(picture: _Picture, row: int, column: int) -> bool:
    """Whether a door of one square has its walls to the left and right, rather than above and below."""
    beside = [picture.at(row, column - 1), picture.at(row, column + 1)].count(WALL)
    across = [picture.at(row - 1, column), picture.at(row + 1, column)].count(WALL)
    return beside >= across


def _solids(picture: _Picture) -> list[Solid]:
    """The wall squares as rectangles: each row's stretches, joined downward where the next row has the same."""
    finished: list[Solid] = []
    open_since: dict[tuple[int, int], int] = {}
    for row in range(len(picture.rows) + 1):
        stretches = dict.fromkeys(_stretches(picture.rows[row]) if row < len(picture.rows) else [])
        ended = [stretch for stretch in open_since if stretch not in stretches]
        finished += [_block(picture, stretch, open_since.pop(stretch), row) for stretch in ended]
        for stretch in stretches:
            open_since.setdefault(stretch, row)
    return finished


def _stretches(line: str) -> list[tuple[int, int]]:
    """First and past-the-last column of each stretch of wall."""
    found: list[tuple[int, int]] = []
    start = line.find(WALL)
    while start >= 0:
        end = start
        while end < len(line) and line[end] == WALL:
            end += 1
        found.append((start, end))
        start = line.find(WALL, end)
    return found


def _block(picture: _Picture, stretch: tuple[int, int], top: int, bottom: int) -> Solid:
    left, right = picture.x(stretch[0]), picture.x(stretch[1])
    low, high = picture.y(bottom), picture.y(top)
    return Solid(((left, low), (right, low), (right, high), (left, high)))
