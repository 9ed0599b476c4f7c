"""The small files that the tests of the language begin from, and put mistakes into."""

from __future__ import annotations

from runner.language.diagnostics import Diagnostic, LanguageError
from runner.language.mission import Mission
from runner.language.reader import read_conditions, read_mission, read_site
from runner.site.values import Battery, Conditions, Lidar, RobotDescription, Site

SITE = """\
site: Test floor
floor: 20 m x 10 m
coordinates: in meters
places:
  ward east: {at: [5, 5], facing: east}
  laboratory: {at: [15, 5], facing: north}
"""

HEAD = """\
mission: Round
site: floor.yaml
robot: cart.yaml
start: ward east
"""

STEPS = """\
steps:
  - go: ward east
"""

DRAWN = """\
site: Drawn floor
square: 50 cm
drawing: |
  ########
  #a.D..b#
  ########
legend:
  a: {place: kitchen, facing: east}
  b: {place: front desk, facing: west}
  D: {door: kitchen door, shut: [22:00-06:00]}
"""

CONDITIONS = """\
conditions: Busy
begins at: 17:30
"""

ROBOT = RobotDescription(
    name="Test cart",
    footprint=((0.3, 0.2), (-0.3, 0.2), (-0.3, -0.2), (0.3, -0.2)),
    speed=0.8,
    reverse_speed=0.2,
    acceleration=0.6,
    turn_speed=1.4,
    turn_acceleration=2.8,
    lidar=Lidar(4.7, 180, 12.0, 8.0, 0.015),
    battery=Battery(240.0, 22.0, 85.0, 300.0),
)


def site(text: str = SITE) -> Site:
    return read_site(text, "floor.yaml")


def mission(body: str, head: str = HEAD) -> Mission:
    """A mission on the test floor: the usual keys at the top, then `body`."""
    return read_mission(head + body, "round.yaml", site(), ROBOT)


def conditions(body: str, doors: str = "doors:\n  store door: {from: [10, 0], to: [10, 1]}\n") -> Conditions:
    """Conditions for the test floor, with one door in it."""
    return read_conditions(CONDITIONS + body, "busy.yaml", site(SITE + doors))


def only(error: LanguageError) -> Diagnostic:
    """The one diagnostic of an error that must have no other."""
    assert len(error.diagnostics) == 1, str(error)
    return error.diagnostics[0]
