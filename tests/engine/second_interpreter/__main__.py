"""More missions than the tests play: `python -m tests.engine.second_interpreter --count 20000 --seed 1`."""

from __future__ import annotations

import argparse
import sys
import time
from collections import Counter

from tests.engine.second_interpreter.comparing import compare


def main() -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.engine.second_interpreter")
    parser.add_argument("--count", type=int, default=2000, help="missions")
    parser.add_argument("--sequences", type=int, default=3, help="of inputs to each mission")
    parser.add_argument("--seed", type=int, default=1, help="the first seed")
    wanted = parser.parse_args()
    seen: Counter[str] = Counter()
    started = time.monotonic()
    differed = 0
    for seed in range(wanted.seed, wanted.seed + wanted.count):
        try:
            compare(seed, seen, wanted.sequences)
        except AssertionError as error:
            differed += 1
            print(f"seed {seed}: {error}", file=sys.stderr)
    print(f"{seen['sequences']} sequences, {seen['inputs']} inputs, in {time.monotonic() - started:.0f} s")
    print(f"{differed} missions with a difference")
    return 1 if differed else 0


if __name__ == "__main__":
    sys.exit(main())
