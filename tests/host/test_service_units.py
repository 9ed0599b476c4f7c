"""The units of README, as the service manager itself reads them."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
from configparser import ConfigParser
from pathlib import Path

import pytest

README = Path(__file__).parents[2] / "README.md"
UNITS = re.compile(r"`(trundle-[a-z-]+\.(?:service|timer))`[^`]*?```ini\n(.*?)```", re.DOTALL)


def units() -> dict[str, str]:
    """The text of each unit, by its name."""
    found = dict(UNITS.findall(README.read_text(encoding="utf-8")))
    assert set(found) == {"trundle-evening.service", "trundle-evening.timer", "trundle-pick-up.service"}
    return found


@pytest.mark.skipif(shutil.which("systemd-analyze") is None, reason="needs systemd-analyze")
def test_the_service_manager_finds_nothing_wrong_with_the_units(tmp_path: Path) -> None:
    program = Path(sys.executable).with_name("trundle")
    for name, text in units().items():
        (tmp_path / name).write_text(text.replace("%h/trundle/.venv/bin/trundle", str(program)), encoding="utf-8")
    runtime = tmp_path / "runtime"
    runtime.mkdir(mode=0o700)
    done = subprocess.run(
        ["systemd-analyze", "--user", "verify", *sorted(map(str, tmp_path.glob("trundle-*")))],
        env={**os.environ, "XDG_RUNTIME_DIR": str(runtime)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert (done.stdout, done.stderr, done.returncode) == ("", "", 0)


def test_a_round_that_breaks_off_is_picked_up_by_the_other_unit() -> None:
    """`OnFailure` counts in the section [Unit] only, and is ignored elsewhere."""
    unit = ConfigParser(interpolation=None, strict=False)
    unit.optionxform = str  # type: ignore[assignment, method-assign]
    unit.read_string(units()["trundle-evening.service"].replace("\\\n", " "))
    assert unit["Unit"]["OnFailure"] == "trundle-pick-up.service"
