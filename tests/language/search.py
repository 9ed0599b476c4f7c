"""`python -m tests.language.search --count 1000000`: mutated missions, read, compiled and checked, one after the other.

Invariant looked for: no exception but `LanguageError`, no text over 2 s of the processor's time, no memory over 500 MB.
Faults are printed as they are found, with a text that repeats them; the last line says how many texts were tried.
"""

from __future__ import annotations

import argparse
import random
import resource
import sys
import time
import traceback
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, field

from tests.language.mutations import MISSIONS, READERS, check, mutated

SECONDS_MOST = 2.0
MEGABYTES_MOST = 400.0
"""More than the process ever had before the search: what other tests in it took says nothing about the reader."""
FAULTS_MOST = 20
MISSION_ONLY = READERS[:1]


@dataclass(slots=True)
class Search:
    """What a search has seen. `read` counts the texts that were missions still, `had` is the memory before it."""

    had: float = 0.0
    tried: int = 0
    read: int = 0
    slowest: float = 0.0
    megabytes: float = 0.0
    faults: list[str] = field(default_factory=list)


def look(seed: int, count: int) -> Search:
    """Try so many texts; the same seed tries the same ones."""
    source, search = random.Random(seed), Search(had=peak())  # noqa: S311
    while search.tried < count and len(search.faults) < FAULTS_MOST:
        text = mutated(source, source.choice(MISSIONS))
        search.tried += 1
        fault = _try(search, text)
        if fault:
            search.faults.append(f"{fault}\nseed {seed}, text number {search.tried}: {text!r}")
    return search


def peak() -> float:
    """The most memory that this process ever had, megabytes."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0


def _try(search: Search, text: str) -> str:
    """What is wrong with how a text was taken; '' if nothing is."""
    begun = time.process_time()
    try:
        search.read += check(text, MISSION_ONLY) == [None]
    except Exception:
        return traceback.format_exc()
    seconds = time.process_time() - begun
    megabytes = peak() - search.had
    search.slowest, search.megabytes = max(search.slowest, seconds), max(search.megabytes, megabytes)
    if seconds > SECONDS_MOST:
        return f"took {seconds:.1f} s"
    return f"took {megabytes:.0f} MB" if megabytes > MEGABYTES_MOST else ""


def main(arguments: Sequence[str]) -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.language.search", description=__doc__)
    parser.add_argument("--count", type=int, default=100_000, help="texts to try")
    parser.add_argument("--seed", type=int, default=1, help="of the first batch; the others follow")
    parser.add_argument("--processes", type=int, default=1)
    parser.add_argument("--batch", type=int, default=5_000, help="texts a line of progress")
    wanted = parser.parse_args(arguments)
    batches = -(-wanted.count // wanted.batch)
    total, begun = Search(), time.monotonic()
    with ProcessPoolExecutor(wanted.processes) as pool:
        seeds = range(wanted.seed, wanted.seed + batches)
        for search in pool.map(look, seeds, [wanted.batch] * batches):
            _add(total, search)
            print(_line(total, time.monotonic() - begun), flush=True)
    return 1 if total.faults else 0


def _add(total: Search, search: Search) -> None:
    for fault in search.faults:
        print(fault, flush=True)
    total.tried += search.tried
    total.read += search.read
    total.slowest = max(total.slowest, search.slowest)
    total.megabytes = max(total.megabytes, search.megabytes)
    total.faults += search.faults


def _line(total: Search, seconds: float) -> str:
    return (
        f"{total.tried:,} texts tried in {seconds:.0f} s, {total.read:,} of them still missions; "
        f"faults {len(total.faults)}; slowest {total.slowest:.2f} s, most memory {total.megabytes:.0f} MB"
    )


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
