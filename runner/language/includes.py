"""Rules and routines of a mission, its own and those of the files it includes.

Every file is read once, however many include it. Names are shared by all: two rules or two routines of one name are a
mistake, wherever they stand.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import TypeVar

from runner.language.diagnostics import quoted, shown, shown_path
from runner.language.fields import Fields, Keys
from runner.language.mission import RetryRule
from runner.language.nodes import Node, Scalar
from runner.language.pages import Page
from runner.language.routines import Routine, read_routine
from runner.language.rules import read_rule

SHARED_KEYS: Keys = {
    "shared": "House rules",
    "include": "[shared.yaml]",
    "retry rules": "{patient: {tries: 3}}",
    "routines": "{hand over: {given: [room], steps: [go: room]}}",
}
FILES_MOST = 20
"""Files that a mission may include, also by way of others."""

Value = TypeVar("Value")


@dataclass(slots=True)
class Shelf:
    """What has been found so far; `keys` tells where each name stands. `open` are the files being read, the including
    one first, and `done` those that need not be read again."""

    rules: dict[str, RetryRule] = field(default_factory=dict)
    routines: dict[str, Routine] = field(default_factory=dict)
    keys: dict[tuple[str, str], tuple[Page, Scalar]] = field(default_factory=dict)
    open: list[Path] = field(default_factory=list)
    done: set[Path] = field(default_factory=set)


def collect(shelf: Shelf, fields: Fields) -> None:
    """Put the rules and routines of a file on the shelf, after those of the files it includes."""
    shelf.open.append(_place_of(Path(fields.page.file)))
    for node in fields.items("include"):
        _include(shelf, fields.page, node)
    shelf.done.add(shelf.open.pop())
    _shelve(shelf, shelf.rules, "retry rule", fields, "retry rules", read_rule)
    _shelve(shelf, shelf.routines, "routine", fields, "routines", read_routine)


def _include(shelf: Shelf, page: Page, node: Node) -> None:
    text = page.text(node, "the path of a file", "shared.yaml")
    if text is None:
        return
    path = Path(page.file).parent / text
    place = _place_of(path)
    if place in shelf.open:
        chain = [*shelf.open[shelf.open.index(place) :], place]
        names = " -> ".join(shown(one.name) for one in chain)
        page.report(node, "A file cannot include itself.", f"The chain is {names}.")
    elif place not in shelf.done and len(shelf.done) + len(shelf.open) > FILES_MOST:
        page.report(node, f"A mission includes at most {FILES_MOST} files.", "Put what they hold into fewer.")
    elif place not in shelf.done:
        inner = page.reading.open(path, blame=(page, node))
        shelf.done.add(place)
        if inner is not None and inner.root is not None:
            fields = Fields(inner, inner.root, "a shared file", SHARED_KEYS)
            fields.name("shared")
            collect(shelf, fields)


def _place_of(path: Path) -> Path:
    """The same for every way to write a path."""
    try:
        return path.resolve()
    except (OSError, ValueError, RuntimeError):
        return path


def _shelve(
    shelf: Shelf,
    found: dict[str, Value],
    kind: str,
    fields: Fields,
    key: str,
    read: Callable[[Page, Scalar, Node], Value],
) -> None:
    for name, node in fields.pairs(key):
        first = shelf.keys.get((kind, name.text))
        if first is not None:
            page, where = first
            sentence = f"There is a {kind} called {quoted(name.text)} already."
            help_text = f"It stands in {shown_path(page.file)}, line {where.start.line + 1}. Give one another name."
            fields.page.report(name, sentence, help_text)
            continue
        shelf.keys[kind, name.text] = fields.page, name
        found[name.text] = read(fields.page, name, node)
