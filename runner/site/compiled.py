"""Where compiled kernels are kept between runs.

Compiling a kernel takes seconds, so numba's cache is worth having; its defaults have three traps. Without a
writable folder the import of a kernel module fails; a kernel that calls one from another file is not compiled
anew when that file changes; and a cache that others can write to is code that others can put into our process.
So each kernel module asks `kernel_compiler` for its decorator and names the files its kernels are made from.
The cache folder is private to the user and keyed by the text of those files and by the versions in use.
No folder at all costs time, never an error.
"""

from __future__ import annotations

import hashlib
import os
import stat
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any, TypeVar, cast

Kernel = TypeVar("Kernel", bound=Callable[..., Any])


def kernel_compiler(*sources: str) -> Callable[[Kernel], Kernel]:
    """A decorator that compiles a kernel: cached, without the interpreter lock, IEEE arithmetic as written.

    `sources` are the files (`__file__`) whose kernels can end up in the result: the module's own, and each module
    whose kernels it calls.
    """
    import numba
    from numba.core import config as numba_config

    config: Any = numba_config
    folder = _cache_folder(_key(sources, numba.__version__))

    def compile_kernel(function: Kernel) -> Kernel:
        before = config.CACHE_DIR
        config.CACHE_DIR = str(folder or "")
        try:
            made = numba.njit(cache=folder is not None, nogil=True, error_model="numpy")(function)
        finally:
            config.CACHE_DIR = before
        return cast(Kernel, made)

    return compile_kernel


def is_kept(kernel: Callable[..., Any]) -> bool:
    """Whether a kernel was compiled before and kept, so that its first call will take no seconds."""
    stats: Any = getattr(kernel, "stats", None)
    folder = Path(stats.cache_path) if stats is not None and stats.cache_path else None
    return folder is not None and any(folder.glob(f"*{kernel.__name__}*.nbi"))


def _key(sources: tuple[str, ...], version: str) -> str:
    digest = hashlib.sha256(version.encode())
    for source in sources:
        digest.update(Path(source).read_bytes())
    return digest.hexdigest()[:16]


def _cache_folder(key: str) -> Path | None:
    for base in _bases():
        folder = base / key
        try:
            base.parent.mkdir(parents=True, exist_ok=True)
            base.mkdir(mode=0o700, exist_ok=True)
            folder.mkdir(mode=0o700, exist_ok=True)
        except OSError:
            continue
        if _is_private(base) and os.access(folder, os.W_OK | os.X_OK):
            return folder
    return None


def _bases() -> Iterator[Path]:
    """Folders to try, the most wanted first."""
    if wanted := os.environ.get("NUMBA_CACHE_DIR"):
        yield Path(wanted)
    home = os.environ.get("XDG_CACHE_HOME") or os.path.expanduser("~/.cache")
    yield Path(home) / "trundle"
    yield Path(tempfile.gettempdir()) / f"trundle-{_user()}"


def _user() -> int:
    return os.getuid() if hasattr(os, "getuid") else 0


def _is_private(folder: Path) -> bool:
    """Whether nobody but this user can write there: a cache holds code that will be run."""
    try:
        status = folder.lstat()
    except OSError:
        return False
    if not hasattr(os, "getuid"):
        return True
    writable_by_others = status.st_mode & (stat.S_IWGRP | stat.S_IWOTH)
    return status.st_uid == os.getuid() and not writable_by_others
