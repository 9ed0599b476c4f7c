"""Golden diagnostics of what is not read of YAML, or is none. Each text follows the four lines of `texts.HEAD`."""

from __future__ import annotations

from tests.language.golden import Case

IN_YAML = (
    Case(
        "a key written twice",
        "steps:\n  - go: ward east\nsteps:\n  - wait: 3 s\n",
        (7, 1, 5),
        '"steps" is written twice; the first stands in line 5.',
        "Keep one of the two.",
    ),
    Case(
        "an anchor",
        "steps: &all\n  - go: ward east\n",
        (5, 8, 4),
        "Anchors are not read.",
        "Leave out the word with the &.",
    ),
    Case(
        "an alias",
        "steps:\n  - go: ward east\nlimits: *slow\n",
        (7, 9, 5),
        "Aliases are not read.",
        "Write the value out.",
    ),
    Case(
        "a tag",
        "steps: !list\n  - go: ward east\n",
        (5, 8, 1),
        "Tags are not read.",
        "Leave out the word with the !.",
    ),
    Case(
        "a quote never closed",
        "steps:\n  - go: 'ward east\n",
        (6, 9, 1),
        "This quote is never closed.",
        "Close it with the same character.",
    ),
    Case(
        "a list never closed",
        "steps:\n  - visit: [ward east, laboratory\n",
        (6, 12, 1),
        "This list is never closed, or lacks a comma.",
        "Write [one, two] with its bracket.",
    ),
    Case(
        "a colon too many",
        "steps:\n  - go: ward east: laboratory\n",
        (6, 18, 1),
        "A colon does not fit here.",
        "Begin a new line before the key, or put a text that holds a colon in quotes.",
    ),
    Case(
        "a tab",
        "steps:\n\t- go: ward east\n",
        (6, 1, 1),
        "A line cannot be indented with a tab.",
        "Use spaces.",
    ),
    Case(
        "a key outside its step",
        "steps:\n  - go: ward east\n  rule: patient\n",
        (7, 3, 1),
        "This line does not fit the list above it.",
        "Begin it with a dash, or indent it like the keys above it.",
    ),
    Case(
        "a character that means something else",
        "steps:\n  - go: @home\n",
        (6, 9, 1),
        "A value cannot begin with this character.",
        "Put the value in quotes.",
    ),
    Case(
        "a list that begins beside its key",
        "steps: - go: ward east\n",
        (5, 8, 1),
        "A list cannot begin here.",
        "Begin the dash on a line of its own, below the key.",
    ),
    Case(
        "a line without a colon",
        "steps:\n  - go: ward east\nlimits\n",
        (7, 1, 1),
        "There is no colon after this key.",
        "Write key: value.",
    ),
    Case(
        "a second document",
        "steps:\n  - go: ward east\n---\nmission: Other\n",
        (7, 1, 3),
        "A second document begins here.",
        "Keep one document in a file.",
    ),
    Case(
        "a key that is a list",
        "steps:\n  - go: ward east\n? [a, b]\n: c\n",
        (7, 3, 1),
        "A list or a mapping cannot be a key.",
        "Write a word before the colon.",
    ),
    Case(
        "nesting without end",
        "steps:\n  - go: ward east\nlimits: [[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[\n",
        (7, 48, 1),
        "Here lists and mappings are nested over 40 deep.",
        "Write it flatter.",
    ),
)
