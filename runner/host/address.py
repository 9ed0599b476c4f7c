"""Where the control socket of a run is: in the run's own folder, which only its owner may enter.

The path of such a socket may be no longer than some hundred bytes, and a run's folder may be. The system's own name for
an open folder is short whatever its path is, so where the path is too long the socket is reached through that.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

NAME = "control"
PATH_BYTES_MOST = 100
"""The system's limit is 107; the library beneath appends nothing, but leave some."""


@contextmanager
def control_address(folder: Path) -> Iterator[str]:
    """The address of the socket, good for as long as the `with` lasts."""
    path = folder.absolute() / NAME
    if len(os.fsencode(path)) <= PATH_BYTES_MOST:
        yield f"ipc://{path}"
        return
    handle = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
    try:
        yield f"ipc:///proc/self/fd/{handle}/{NAME}"
    finally:
        os.close(handle)
