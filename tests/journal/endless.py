"""Writes a record without end: `python -m tests.journal.endless FOLDER` says each number once it is durable.

For tests that kill it. With a second argument, a number of bytes, no file may grow beyond them; the writer then says
"refused", makes room, writes once more and ends.
"""

from __future__ import annotations

import resource
import sys
from pathlib import Path

from runner.engine.values import StepBegan, Tick
from runner.journal.errors import JournalError
from runner.journal.writer import JournalWriter
from tests.journal.records import MACHINE, SOURCES, header, seen


def main(folder: Path, most: int | None) -> None:
    with JournalWriter.create(folder, header(folder.name), SOURCES, MACHINE) as writer:
        if most is not None:
            resource.setrlimit(resource.RLIMIT_FSIZE, (most, resource.RLIM_INFINITY))
        stamp = 0.0
        while True:
            stamp += 0.25
            try:
                writer.track(seen(stamp, x=stamp % 30.0))
                writer.write(stamp, [Tick(stamp), StepBegan(1, "go ward east " * 20, 3)])
            except JournalError as error:
                print("refused", error, flush=True)
                break
            print(writer.last_entry, flush=True)
        resource.setrlimit(resource.RLIMIT_FSIZE, (resource.RLIM_INFINITY, resource.RLIM_INFINITY))
        writer.write(stamp, [Tick(stamp)])
        print(writer.last_entry, flush=True)


if __name__ == "__main__":
    main(Path(sys.argv[1]), int(sys.argv[2]) if len(sys.argv) > 2 else None)
