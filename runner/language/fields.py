"""The keys of a mapping, read by name: unknown keys and missing ones are reported with what could be written."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import TypeVar

from runner.language.diagnostics import nearest, nearest_word, quoted
from runner.language.mission import Mark
from runner.language.nodes import Mapping, Node, Scalar, Sequence
from runner.language.pages import Page
from runner.language.quantities import Amount, Count

Value = TypeVar("Value")

Keys = dict[str, str]
"""Every key a mapping may have, with an example of what follows it."""


class Fields:
    """One mapping whose keys are known. `what` names it in a sentence: "a retry rule"."""

    __slots__ = ("keys", "mapping", "mistaken", "page", "what")

    def __init__(self, page: Page, mapping: Mapping, what: str, keys: Keys) -> None:
        self.page = page
        self.mapping = mapping
        self.what = what
        self.keys = keys
        self.mistaken: set[str | None] = set()
        """Keys that an unknown key was probably meant to be: that they are missing is not said again."""
        for key, (node, _) in mapping.pairs.items():
            if key not in keys:
                page.report(node, f"{what.capitalize()} has no key {quoted(key)}.", nearest(key, keys, "key"))
                self.mistaken.add(nearest_word(key, keys))

    def get(self, key: str) -> Node | None:
        """The value of a key that may be left out."""
        pair = self.mapping.pairs.get(key)
        return pair[1] if pair is not None else None

    def need(self, key: str) -> Node | None:
        """The value of a key, or None, reported, where it is missing."""
        pair = self.mapping.pairs.get(key)
        if pair is not None:
            return pair[1]
        if key not in self.mistaken:
            help_text = f"Add for example: {key}: {self.keys[key]}"
            self.page.report(self.mapping, f"{self.what.capitalize()} needs {quoted(key)}.", help_text)
        return None

    def pair_mark(self, key: str) -> Mark:
        """Where a key that is there stands, with its value."""
        return self.page.pair_mark(*self.mapping.pairs[key])

    def number(self, key: str, kind: Amount) -> float:
        """The amount at a key that must be there."""
        node = self.need(key)
        return kind.least if node is None else amount(self.page, node, kind, self.keys[key])

    def number_or(self, key: str, kind: Amount, default: float) -> float:
        """The amount at a key, or the default where it is left out."""
        node = self.get(key)
        return default if node is None else amount(self.page, node, kind, self.keys[key])

    def count(self, key: str, kind: Count) -> int:
        """The whole number at a key that must be there."""
        node = self.need(key)
        return kind.least if node is None else count(self.page, node, kind, self.keys[key])

    def phrase(self, key: str, read: Callable[[str], Value], default: Value) -> Value:
        """What `read` makes of the text at a key, or the default where it is left out."""
        node = self.get(key)
        if node is None:
            return default
        return self.page.phrase(node, read, default, quoted(key), self.keys[key])

    def name(self, key: str) -> str:
        """The name at a key that must be there: one line of text."""
        node = self.need(key)
        return "" if node is None else name(self.page, node, self.keys[key])

    def items(self, key: str) -> list[Node]:
        """The items of the list at a key that may be left out. An empty list is reported."""
        node = self.get(key)
        return [] if node is None else items(self.page, node, quoted(key), self.keys[key], optional=True)

    def pairs(self, key: str) -> Iterable[tuple[Scalar, Node]]:
        """Names with what belongs to them at a key; none where it is left out."""
        node = self.get(key)
        if node is None:
            return ()
        inner = mapping(self.page, node, quoted(key), self.keys[key])
        return () if inner is None else inner.pairs.values()


def amount(page: Page, node: Node, kind: Amount, example: str) -> float:
    """The amount a scalar holds; the least one after a report."""
    return page.phrase(node, kind.read, kind.least, kind.measure.name, example)


def count(page: Page, node: Node, kind: Count, example: str) -> int:
    """The whole number a scalar holds; the least one after a report."""
    return page.phrase(node, kind.read, kind.least, "a whole number", example)


def name(page: Page, node: Node, example: str) -> str:
    """One line of text, '' after a report."""
    text = page.text(node, "a name", example)
    if text is None:
        return ""
    if "\n" in text or len(text) > 80 or text != text.strip():
        page.report(node, "A name is one line of at most 80 characters.", f"Write for example {example}.")
        return ""
    return text


def items(page: Page, node: Node, what: str, example: str, optional: bool = False) -> list[Node]:
    """The items of a list that is not empty; none after a report."""
    if not isinstance(node, Sequence):
        page.report(node, f"A list is meant for {what}.", f"Write for example {example}.")
        return []
    if not node.items:
        instead = f"Write for example {example}{', or leave the key out' if optional else ''}."
        page.report(node, f"The list of {what} is empty.", instead)
    return node.items


def mapping(page: Page, node: Node, what: str, example: str) -> Mapping | None:
    """A mapping that is not empty, or None after a report."""
    if isinstance(node, Mapping) and node.pairs:
        return node
    page.report(node, f"Keys and values are meant for {what}.", f"Write for example {example}.")
    return None


def known(page: Page, node: Node, names: list[str], kind: str, example: str) -> str:
    """One of the names there are; '' after a report."""
    text = page.text(node, f"a {kind}", example)
    if text is None or text in names:
        return text or ""
    page.report(node, f"There is no {kind} called {quoted(text)}.", nearest(text, names, kind))
    return ""
