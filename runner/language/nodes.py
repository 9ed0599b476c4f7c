"""Text to marked nodes: the shape of a YAML file, with the place of every value, and nothing guessed about meaning.

Scalars stay text. What `012`, `on` or `6:00` means is decided by whoever knows which value is expected, so none of
YAML 1.1's own readings ever applies. The tree is built from the parser's events, in one pass and without recursion;
libyaml's parser is used where it is there. What a mission has no use for is refused where it stands: tags, anchors,
aliases (and with them every exploding or circular file), keys that are not words, keys written twice, second documents
and nesting beyond `DEPTH_MOST`.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Protocol

from runner.language.collection import collection_off
from runner.language.decoding import Report
from runner.language.diagnostics import quoted

DEPTH_MOST = 40
"""Levels of lists and mappings. A step in a loop in a loop stands at level 8."""


class Position(Protocol):
    """A position as the parser gives it, counted from 0."""

    @property
    def line(self) -> int: ...

    @property
    def column(self) -> int: ...


@dataclass(slots=True)
class Scalar:
    """A word, a phrase or a block of text. `style` is '' for plain text, else the character that opens it."""

    text: str
    style: str
    start: Position
    end: Position


@dataclass(slots=True)
class Sequence:
    """A list."""

    items: list[Node]
    start: Position
    end: Position


@dataclass(slots=True)
class Mapping:
    """Keys and values in the order written, each with the node of its key."""

    pairs: dict[str, tuple[Scalar, Node]]
    start: Position
    end: Position


Node = Scalar | Sequence | Mapping


def parse(text: str, report: Report) -> Node | None:
    """The tree of a text, or None after a report of why there is none.

    Keys written twice are reported too, but leave a tree, with the first of them.
    """
    import yaml

    from runner.language.syntax import report_syntax

    loader = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
    try:
        with collection_off():
            return _Builder(report).build(yaml.parse(text, Loader=loader))
    except yaml.YAMLError as error:
        report_syntax(error, text, report)
        return None


def width_of(node: Node) -> int:
    """Characters of the first line of a node that can be underlined; 1 where its end is not on that line."""
    return max(node.end.column - node.start.column, 1) if node.end.line == node.start.line else 1


class _Builder:
    """Builds the tree from events, with a stack of the collections that are open and the key each one waits with."""

    def __init__(self, report: Report) -> None:
        self._report = report
        self._open: list[Sequence | Mapping] = []
        self._keys: list[Scalar | None] = []
        self._root: Node | None = None
        self._refused = False

    def build(self, events: Iterator[Any]) -> Node | None:
        """The root, or None where something was refused."""
        import yaml

        documents = 0
        for event in events:
            kind = type(event)
            if kind is yaml.ScalarEvent:
                self._refuse_properties(event)
                self._add(Scalar(event.value, event.style or "", event.start_mark, event.end_mark))
            elif kind is yaml.MappingStartEvent or kind is yaml.SequenceStartEvent:
                if not self._enter(event, kind is yaml.MappingStartEvent):
                    return None
            elif kind is yaml.MappingEndEvent or kind is yaml.SequenceEndEvent:
                self._open.pop().end = event.end_mark
                self._keys.pop()
            elif kind is yaml.AliasEvent:
                self._refuse(event.start_mark, len(event.anchor) + 1, "Aliases are not read.", "Write the value out.")
                self._add(Scalar("", "*", event.start_mark, event.end_mark))
            elif kind is yaml.DocumentStartEvent:
                documents += 1
                if documents > 1:
                    self._refuse(event.start_mark, 3, "A second document begins here.", "Keep one document in a file.")
                    return None
        return self._finish()

    def _finish(self) -> Node | None:
        root = self._root
        if root is None or (isinstance(root, Scalar) and not root.text and not root.style):
            self._report(0, 0, 1, "This file is empty.", "Begin with what it is, for example: mission: Evening round")
            return None
        return None if self._refused else root

    def _enter(self, event: Any, is_mapping: bool) -> bool:
        self._refuse_properties(event)
        start, end = event.start_mark, event.end_mark
        if len(self._open) >= DEPTH_MOST:
            self._refuse(start, 1, f"Here lists and mappings are nested over {DEPTH_MOST} deep.", "Write it flatter.")
            return False
        node = Mapping({}, start, end) if is_mapping else Sequence([], start, end)
        self._add(node)
        self._open.append(node)
        self._keys.append(None)
        return True

    def _add(self, node: Node) -> None:
        """Puts a node where it belongs: the root, the next item, the next key or the value of the key before."""
        if not self._open:
            self._root = node
            return
        owner = self._open[-1]
        if isinstance(owner, Sequence):
            owner.items.append(node)
            return
        key = self._keys[-1]
        if key is not None:
            self._keys[-1] = None
            first = owner.pairs.setdefault(key.text, (key, node))[0]
            if first is not key:
                self._report_twice(key, first)
        elif isinstance(node, Scalar):
            self._keys[-1] = node
        else:
            self._refuse(node.start, 1, "A list or a mapping cannot be a key.", "Write a word before the colon.")
            self._keys[-1] = Scalar("", "?", node.start, node.end)

    def _report_twice(self, key: Scalar, first: Scalar) -> None:
        sentence = f"{quoted(key.text)} is written twice; the first stands in line {first.start.line + 1}."
        self._report(key.start.line, key.start.column, width_of(key), sentence, "Keep one of the two.")

    def _refuse_properties(self, event: Any) -> None:
        if event.anchor is not None:
            width = len(event.anchor) + 1
            self._refuse(event.start_mark, width, "Anchors are not read.", "Leave out the word with the &.")
        elif event.tag is not None:
            self._refuse(event.start_mark, 1, "Tags are not read.", "Leave out the word with the !.")

    def _refuse(self, start: Position, width: int, sentence: str, help_text: str) -> None:
        self._refused = True
        self._report(start.line, start.column, width, sentence, help_text)
