"""Reading, compiling and checking a mission of many steps, beside PyYAML's C loader on the same text.

The peer only builds dictionaries and lists of strings and guesses at types; ours makes marked steps, a machine, and the
proofs on its table. Two texts: legs with their options, as authors write them, 10,000 steps; and the tersest steps
there are, of which 100,000 fit into a file, to see that time grows in proportion. Planning of routes is left out: no
visit here is ordered by distance. Times are the processor's, the best of three rounds in which all take turns.
"""

from __future__ import annotations

import gc
import time
from collections.abc import Callable, Generator, Iterator

import yaml

from runner.language.reader import read_mission
from runner.machine.compiler import compile_mission
from runner.machine.table_checks import check_table
from tests.bench.harness import Row
from tests.language import texts

GOAL = "2"
ROUNDS = 3
LEG = "  - go: laboratory\n    rule: patient\n    within: 4 min\n    otherwise: skip\n"
MIXED = LEG + "  - wait: 20 s\n  - count: trays\n  - when: battery < 20 %\n    then: [notify: low]\n"
TERSE = "- go: a\n"
HEAD = texts.HEAD + "retry rules: {patient: {tries: 3}}\n"


def measure() -> Iterator[Row]:
    yield from rows_for("legs", HEAD + "steps:\n" + LEG * 10_000)
    yield from rows_for("mixed", HEAD + "steps:\n" + MIXED * 2_000)
    terse = texts.HEAD.replace("ward east", "a") + "steps:\n"
    seconds = {}
    for count in (10_000, 100_000):
        seconds[count] = yield from rows_for(f"terse, {count:,} steps", terse + TERSE * count)
    growth = seconds[100_000] / seconds[10_000]
    yield Row("language, terse: 100,000 steps over 10,000", growth, "times", "proportion", 10.0, growth / 10.0, "1")


def rows_for(name: str, text: str) -> Generator[Row, None, float]:
    """The rows of one text; returns our time for all of it."""
    site = texts.site(texts.SITE.replace("ward east", "a")) if "start: a" in text else texts.site()
    mission = read_mission(text, "round.yaml", site, texts.ROBOT)
    machine = compile_mission(mission)
    parts: dict[str, Callable[[], object]] = {
        "read": lambda: read_mission(text, "round.yaml", site, texts.ROBOT),
        "compile": lambda: compile_mission(mission),
        "check": lambda: check_table(machine),
        "all three": lambda: check_table(compile_mission(read_mission(text, "round.yaml", site, texts.ROBOT))),
    }
    peers, times = [], dict.fromkeys(parts, float("inf"))
    for _ in range(ROUNDS):
        peers.append(processor_time(lambda: yaml.load(text, yaml.CSafeLoader)))
        times = {part: min(times[part], processor_time(action)) for part, action in parts.items()}
    peer = min(peers)
    for part, seconds in times.items():
        goal = GOAL if part == "all three" else ""
        yield Row(f"language, {name}: {part}", seconds, "s", "PyYAML's C loader", peer, seconds / peer, goal)
    return times["all three"]


def processor_time(action: Callable[[], object]) -> float:
    """Seconds of this process's own work, which others on the machine disturb least."""
    gc.collect()
    begun = time.process_time()
    action()
    return time.process_time() - begun
