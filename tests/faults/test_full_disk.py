"""A disk that fills up under a run: a small file system in memory, mounted in a namespace of its own."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

TRUNDLE = Path(sys.executable).parent / "trundle"

SCRIPT = r"""
set -u
mount -t tmpfs -o size=1500k tmpfs "$DISK"
mkdir "$DISK/runs"
export TRUNDLE_RUNS="$DISK/runs"
"$TRUNDLE" run evening-round --pace 60 --detach > /dev/null || exit 90
sleep 1
dd if=/dev/zero of="$DISK/filler" bs=4k 2> /dev/null   # until there is no room left
df --output=avail "$DISK" | tail -1
for _ in $(seq 100); do
  "$TRUNDLE" runs | grep -q "record" && break   # the trouble is told in the list of runs
  sleep 0.1
done
"$TRUNDLE" runs
"$TRUNDLE" release 2>&1                          # no: it still cannot be recorded
echo "released: $?"
rm "$DISK/filler"
"$TRUNDLE" release 2>&1
echo "released: $?"
"$TRUNDLE" watch --plain > /dev/null
echo "ended: $?"
"$TRUNDLE" verify
echo "verified: $?"
"""


def namespaces() -> bool:
    """Whether a file system can be mounted in a namespace of one's own here."""
    if shutil.which("unshare") is None:
        return False
    tried = subprocess.run(
        ["unshare", "-rm", "mount", "-t", "tmpfs", "tmpfs", "/mnt"], capture_output=True, check=False
    )
    return tried.returncode == 0


@pytest.mark.skipif(not namespaces(), reason="no file system can be mounted in a namespace here (unshare -rm)")
def test_a_run_whose_disk_is_full_holds_the_robot_waits_and_goes_on_when_there_is_room(tmp_path: Path) -> None:
    disk = tmp_path / "disk"
    disk.mkdir()
    done = subprocess.run(
        ["unshare", "-rm", "sh", "-c", SCRIPT],
        capture_output=True, text=True, timeout=180.0, check=False,
        env={**os.environ, "DISK": str(disk), "TRUNDLE": str(TRUNDLE)},
    )  # fmt: skip
    said = done.stdout
    assert "the disk is full" in said, said + done.stderr
    first, second = (line for line in said.splitlines() if line.startswith("released:"))
    assert first != "released: 0", said
    assert second == "released: 0", said
    assert "ended: 0" in said, said
    assert "verified: 0" in said, said
