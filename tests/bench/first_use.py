"""The first run after an installation, when every kernel is compiled: the whole command, with an empty cache.

The peer is the same command once more, when what was compiled is found again.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from pathlib import Path

from tests.bench.harness import Row

COMMAND = [sys.executable, "-c", "from runner.cli import main; raise SystemExit(main())"]
ERRAND = ["run", "short-errand", "--pace", "max", "--plain"]


def measure() -> Iterator[Row]:
    with tempfile.TemporaryDirectory() as name:
        first, again = seconds_of_a_run(Path(name)), seconds_of_a_run(Path(name))
    yield Row("first run after an installation", first, "s", "the second", again, first / again, "under 20 s")


def seconds_of_a_run(folder: Path) -> float:
    """Wall time of a short errand whose kernels are kept in a folder."""
    places = {"NUMBA_CACHE_DIR": str(folder / "kernels"), "TRUNDLE_RUNS": str(folder / "runs")}
    begun = time.perf_counter()
    subprocess.run([*COMMAND, *ERRAND], env={**os.environ, **places}, check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - begun
