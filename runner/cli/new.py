"""`trundle new`: a folder with a small site, a robot and a mission that run, to begin from."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from runner.cli.exits import Exit

SITE = """\
# The floor, drawn: a square is 25 cm, # is wall, a dot is free. Letters are explained in the legend.
site: Small office
square: 25 cm
drawing: |
  ########################################
  #..................#...................#
  #..................#...................#
  #..................#...................#
  #.......s..........#.........m.........#
  #..................#...................#
  #..................#...................#
  #..................#...................#
  #######SSSSS##############MMMMM#########
  #......................................#
  #......................................#
  #......................................#
  #....d............................p....#
  #......................................#
  #......................................#
  #......................................#
  ########################################
legend:
  d: {place: dock, facing: east}
  s: {place: store, facing: north}
  m: {place: mail room, facing: north}
  p: {place: printer, facing: east}
  S: {door: store door}
  M: {door: mail room door}
"""

ROBOT = """\
# What the robot is. Put in the numbers of yours.
robot: Tray cart
footprint: 48 cm x 40 cm      # length x width
speed: 0.7 m/s
reverse speed: 0.15 m/s
acceleration: 0.5 m/s2
turn speed: 90 deg/s
turn acceleration: 180 deg/s2
lidar: {field of view: 360 deg, beams: 180, range: 8 m, rate: 8 Hz, noise: 1 cm}
battery: {capacity: 150 Wh, idle: 10 W, driving: 40 W, charging: 100 W}
"""

ROUND = """\
# What the robot does. Try:  trundle check round.yaml   and then   trundle run round.yaml
mission: First round
site: site.yaml
robot: robot.yaml
start: dock

retry rules:
  patient:                    # when a leg counts as stalled, what is tried, and when to give up
    tries: 2
    rest between tries: 10 s
    stalled when: under 0.3 m of progress in 12 s
    recover: [replan, clear 2 m, ease back 0.3 m, rest 10 s]
    give up after: 5 min

standing orders:
  - name: low battery
    when: battery < 15 % for 5 s
    do:
      - charge: {at: dock, until: battery >= 60 %, up to: 2 h}
    then: carry on

routines:
  deliver:
    given: [room]
    steps:
      - go: room
        rule: patient
        within: 3 min
        otherwise: skip
      - wait: 5 s             # time to take the tray
      - when: last leg arrived
        then: [count: deliveries]
        else: [notify: "Nothing was delivered to {room}."]

steps:
  - visit: [store, mail room, printer]
    order: shortest
    each: deliver
  - go: dock
    rule: patient
"""

FILES = {"site.yaml": SITE, "robot.yaml": ROBOT, "round.yaml": ROUND}


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "new",
        help="write a small site, robot and mission to begin from",
        description="Makes a folder with a small site, a robot and a mission that run. Overwrites nothing.",
    )
    parser.add_argument("folder", metavar="FOLDER", help="the folder; made if it is not there")


def run(arguments: argparse.Namespace) -> int:
    folder = Path(arguments.folder)
    try:
        written = _write(folder)
    except FileExistsError as error:
        there = Path(str(error.filename))
        print(f"{there} is there already. Nothing was written; name another folder.", file=sys.stderr)
        return Exit.MISTAKE
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else "this is not a file name"
        print(f"{folder} cannot be written: {reason}.", file=sys.stderr)
        return Exit.MISTAKE
    for path in written:
        print(f"wrote {path}")
    print(f"Next: trundle run {folder / 'round.yaml'}")
    return Exit.OK


def _write(folder: Path) -> list[Path]:
    """All files or none; FileExistsError where one is there."""
    paths = [folder / name for name in FILES]
    for path in paths:
        if path.exists():
            raise FileExistsError(17, "it is there already", str(path))
    folder.mkdir(parents=True, exist_ok=True)
    for path, text in zip(paths, FILES.values(), strict=True):
        path.write_text(text, encoding="utf-8")
    return paths
