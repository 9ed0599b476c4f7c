"""The cache of compiled kernels: private, keyed by what the kernels are made from, and never a reason to fail."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

MODULE = """
import sys
from runner.site.compiled import is_kept, kernel_compiler
kernel = kernel_compiler(__file__)

@kernel
def doubled(number):
    return 2.0 * number

print("kept before" if is_kept(doubled) else "not kept before", file=sys.stderr)
print(doubled(1.0))
"""


def run_kernel(folder: Path, **environment: str) -> subprocess.CompletedProcess[str]:
    """Compile and call a small kernel in a fresh process, with only the named cache settings in its environment."""
    module = folder / "small_kernel.py"
    module.write_text(MODULE)
    settings = {name: value for name, value in os.environ.items() if name not in ("NUMBA_CACHE_DIR", "XDG_CACHE_HOME")}
    return subprocess.run(
        [sys.executable, str(module)], env=settings | environment, capture_output=True, text=True, check=False
    )


def test_kernels_are_kept_in_the_users_cache_folder(tmp_path: Path) -> None:
    done = run_kernel(tmp_path, XDG_CACHE_HOME=str(tmp_path))
    assert done.stdout == "2.0\n", done.stderr
    assert list(tmp_path.glob("trundle/*/*/*.nbi"))
    assert (tmp_path / "trundle").stat().st_mode & 0o077 == 0


def test_whether_a_kernel_must_still_be_compiled_can_be_told_beforehand(tmp_path: Path) -> None:
    first, second = (run_kernel(tmp_path, XDG_CACHE_HOME=str(tmp_path)) for _ in range(2))
    assert (first.stderr, second.stderr) == ("not kept before\n", "kept before\n")


def test_a_folder_that_cannot_be_used_is_passed_over(tmp_path: Path) -> None:
    in_the_way = tmp_path / "file"
    in_the_way.write_text("")
    done = run_kernel(tmp_path, NUMBA_CACHE_DIR=str(in_the_way), XDG_CACHE_HOME=str(in_the_way), TMPDIR=str(tmp_path))
    assert done.stdout == "2.0\n", done.stderr
    assert list(tmp_path.glob("trundle-*/*/*/*.nbi"))


def test_a_folder_others_can_write_to_is_passed_over(tmp_path: Path) -> None:
    shared = tmp_path / "shared" / "trundle"
    shared.mkdir(parents=True)
    shared.chmod(0o777)
    done = run_kernel(tmp_path, XDG_CACHE_HOME=str(tmp_path / "shared"), TMPDIR=str(tmp_path))
    assert done.stdout == "2.0\n", done.stderr
    assert not list(shared.rglob("*.nbi"))
