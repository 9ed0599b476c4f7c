"""From files to checked values: the way in to this room.

Every function returns a whole value or raises `LanguageError` with all problems of all files it read; nothing else is
raised for whatever a file may hold. The formats are written down in FILES.md.
"""

from __future__ import annotations

from pathlib import Path
from typing import TypeVar

from runner.language.collection import collection_off
from runner.language.conditions_file import read_conditions_page
from runner.language.mission import Mission, Source
from runner.language.mission_file import Ground, read_mission_page
from runner.language.pages import Reading
from runner.language.robot_file import read_robot_page
from runner.language.site_file import read_site_page
from runner.site.values import Conditions, RobotDescription, Site

Value = TypeVar("Value")


@collection_off()
def load_mission(path: Path) -> Mission:
    """The mission in a file, with its site and robot, whose paths are seen from the folder of the mission."""
    reading = Reading()
    page = reading.open(path)
    mission = None if page is None else read_mission_page(page)
    return _whole(reading, mission)


@collection_off()
def read_mission(text: str, file: str, site: Site, robot: RobotDescription) -> Mission:
    """The mission in a text, on a site and for a robot that are at hand; the files it names are not opened."""
    reading = Reading()
    page = reading.open_text(text, file)
    mission = None if page is None else read_mission_page(page, Ground(site, robot))
    return _whole(reading, mission)


def load_site(path: Path) -> Site:
    """The site in a file."""
    reading = Reading()
    page = reading.open(path)
    return _whole(reading, None if page is None else read_site_page(page))


def read_site(text: str, file: str) -> Site:
    """The site in a text."""
    reading = Reading()
    page = reading.open_text(text, file)
    return _whole(reading, None if page is None else read_site_page(page))


def load_robot(path: Path) -> RobotDescription:
    """The robot in a file."""
    reading = Reading()
    page = reading.open(path)
    return _whole(reading, None if page is None else read_robot_page(page))


def load_conditions(path: Path, site: Site) -> Conditions:
    """The conditions in a file, for a site whose doors and places they name."""
    return load_conditions_with_source(path, site)[0]


def load_conditions_with_source(path: Path, site: Site) -> tuple[Conditions, Source]:
    """The conditions in a file, and its text for the record."""
    reading = Reading()
    page = reading.open(path)
    conditions = _whole(reading, None if page is None else read_conditions_page(page, site))
    return conditions, reading.sources[0]


def read_conditions(text: str, file: str, site: Site) -> Conditions:
    """The conditions in a text."""
    reading = Reading()
    page = reading.open_text(text, file)
    return _whole(reading, None if page is None else read_conditions_page(page, site))


def _whole(reading: Reading, value: Value | None) -> Value:
    """The value, if there was no problem; otherwise all of them."""
    reading.close()
    assert value is not None
    return value
