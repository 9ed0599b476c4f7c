"""A run of days stays flat in memory: that of its process at the end is within a tenth of that after an hour."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

PROGRAM = """
import sys, tempfile
from pathlib import Path
import missions, runner
from runner.host.board import Board
from runner.host.launch import Order, carry_out
from runner.language.reader import load_conditions

folder, hours = Path(sys.argv[1]), float(sys.argv[2])
there = Path(missions.__file__).parent
path = folder / "days.yaml"
path.write_text(f'''mission: Days
site: {there / "sites/harbour-clinic.yaml"}
robot: {there / "robots/small-cart.yaml"}
start: charging bay
standing orders:
  - name: low battery
    when: battery < 25 %
    do: [{{charge: {{at: charging bay, until: battery >= 80 %, up to: 3 h, otherwise: skip}}}}]
    then: carry on
steps:
  - repeat:
      for: {hours:g} h
      steps:
        - visit: [ward west, laboratory, reception]
          otherwise: skip
        - wait: 8 min
''')
mission = runner.load(path)
board = Board("days")
marks, due = [], 3600.0

def resident():
    for line in open("/proc/self/status"):
        if line.startswith("VmRSS"):
            return int(line.split()[1]) / 1024.0

def look():
    global due
    view = board.view()
    if view is not None and view.stamp >= due:
        due += 3600.0
        marks.append(resident())

conditions = load_conditions(there / "conditions/busy.yaml", mission.site)
order = Order(mission, runner.compile(mission), conditions, None, 1, None)
carry_out(order, folder / "run", board, look)
print(round(marks[0], 1), round(marks[-1], 1), round(max(marks), 1), len(marks))
"""


def megabytes_after_an_hour_and_at_the_end(folder: Path, hours: float) -> tuple[float, float]:
    done = subprocess.run(
        [sys.executable, "-c", PROGRAM, str(folder), str(hours)],
        capture_output=True, text=True, check=True, env={**os.environ, "TRUNDLE_RUNS": str(folder)},
    )  # fmt: skip
    first, last, most, looks = map(float, done.stdout.split())
    print(f"{hours:g} h: {first} MB after an hour, {last} MB at the end, at most {most} MB, {looks:g} looks")
    return first, last


def test_a_few_hours_leave_the_memory_flat(tmp_path: Path) -> None:
    first, last = megabytes_after_an_hour_and_at_the_end(tmp_path, 2.5)
    assert last <= 1.1 * first


@pytest.mark.soak
def test_three_days_leave_the_memory_flat(tmp_path: Path) -> None:
    first, last = megabytes_after_an_hour_and_at_the_end(tmp_path, 72.0)
    assert last <= 1.1 * first
