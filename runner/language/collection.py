"""Work that builds a large structure without cycles, with the garbage collector off.

The collector walks all that is alive again and again while it grows: a third of the time of a small mission, two thirds
of that of a large one.
"""

from __future__ import annotations

import gc
from collections.abc import Iterator
from contextlib import contextmanager


@contextmanager
def collection_off() -> Iterator[None]:
    """Keeps the garbage collector off inside, if it was on; also a decorator."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()
