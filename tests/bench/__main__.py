"""`python -m tests.bench [NAME...] [--json]`: measurements as a plain table, or as JSON lines."""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Sequence
from dataclasses import asdict

from tests.bench import harness
from tests.bench.harness import Row

COLUMNS = "{:<44} {:>12} {:<14} {:<30} {:>12} {:>8}  {}"


def main(arguments: Sequence[str]) -> int:
    known = harness.names()
    parser = argparse.ArgumentParser(prog="python -m tests.bench", description=f"Measurements: {', '.join(known)}.")
    parser.add_argument("names", nargs="*", metavar="NAME", help="what to measure; everything if left out")
    parser.add_argument("--json", action="store_true", help="one JSON object a line")
    wanted = parser.parse_args(arguments)
    unknown = [name for name in wanted.names if name not in known]
    if unknown:
        parser.error(f"no measurement is called {unknown[0]}; there are: {', '.join(known)}")
    if not wanted.json:
        print(COLUMNS.format("name", "value", "unit", "peer", "peer value", "ratio", "goal"))
    for name in wanted.names or known:
        for row in harness.load(name)():
            print(json.dumps(asdict(row)) if wanted.json else as_line(row), flush=True)
    return 0


def as_line(row: Row) -> str:
    peer_value = "" if row.peer_value is None else f"{row.peer_value:.4g}"
    ratio = "" if row.ratio is None else f"{row.ratio:.3g}"
    return COLUMNS.format(row.name, f"{row.value:.4g}", row.unit, row.peer, peer_value, ratio, row.goal).rstrip()


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
