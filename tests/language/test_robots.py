"""What a robot file says of the robot's senses, and what is told where it says it wrongly."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from runner.language.diagnostics import LanguageError
from runner.language.reader import load_robot
from runner.site.values import Filters, Odometry, Post, RobotDescription, Sweep, UnseenSpace
from tests.language import texts
from tests.language.test_sites import example


def read(tmp_path: Path, more: str, change: tuple[str, str] = ("", "")) -> RobotDescription:
    path = tmp_path / "cart.yaml"
    path.write_text(example("robot:").replace(*change) + more)
    return load_robot(path)


def test_the_senses_of_the_reference_are_read(tmp_path: Path) -> None:
    robot = read(tmp_path, example("posts:"))
    lidar = robot.lidar
    assert (lidar.dropouts, lidar.latency, lidar.height) == (0.005, 0.1, 0.18)
    assert lidar.beam_width == pytest.approx(math.radians(0.5))
    assert robot.posts == (Post((0.25, 0.2), 0.03),)
    assert robot.sweep == Sweep(math.pi / 2.0, 60, 3.5, 2.0, 0.02, 0.25)
    assert robot.filters == Filters(shadow_points=False, own_body=False, floor_returns=False)
    assert robot.unseen_space is UnseenSpace.KEEP_OUT


def test_what_is_left_out_is_a_plain_lidar_with_its_filters_on(tmp_path: Path) -> None:
    robot = read(tmp_path, "", ("  dropouts: 0.5 % ", "  # "))
    assert robot.lidar.dropouts == 0.0
    assert (robot.posts, robot.sweep, robot.filters, robot.unseen_space) == ((), None, Filters(), UnseenSpace.KEEP_OUT)


def test_how_the_reference_robot_drives_is_read(tmp_path: Path) -> None:
    robot = read(tmp_path, example("sideways speed:"))
    assert robot.sideways_speed == 0.3
    assert robot.odometry == Odometry(0.05, 0.01, math.radians(1.2), 0.03, math.radians(0.3), 0.01)
    assert (robot.planner, robot.follower) == ("disc-search", "dynamic-window")


def test_a_robot_is_usual_where_its_file_says_nothing_of_how_it_drives(tmp_path: Path) -> None:
    robot = read(tmp_path, "odometry: {turn by turn: 6 %}\n")
    assert (robot.sideways_speed, robot.odometry) == (0.0, Odometry(turn_by_turn=0.06))


@pytest.mark.parametrize(
    ("more", "sentence", "help_text"),
    [
        (
            "sideways speed: 8 m/s\n",
            "The sideways speed cannot be 8 m/s.",
            "Write something from 0 m/s to 3 m/s.",
        ),
        (
            "odometry: {turn by way: 5 %}\n",
            '"%" is not a unit of angle.',
            "Write 5 deg.",
        ),
        (
            "planner: what a planner\n",
            'No planner or follower can be called "what a planner".',
            "Write letters, digits, hyphens, dots and underscores, as in disc-search.",
        ),
        ("filters: {shadow points: maybe}\n", 'A filter is on or off, not "maybe".', "Write on or off."),
        (
            "filters: {shadow point: off}\n",
            'A set of filters has no key "shadow point".',
            'The nearest key is "shadow points".',
        ),
        (
            "unseen space: keep away\n",
            'What to do about unseen space cannot be "keep away".',
            "Known: keep out, drive slowly.",
        ),
        ("posts: [{at: [25 cm, 20 cm]}]\n", 'A post needs "thickness".', "Add for example: thickness: 3 cm"),
        ("posts: [25 cm]\n", "Keys and values are meant for a post.", None),
        (
            "sweep: {field of view: 270 deg, columns: 60, range: 3 m}\n",
            "The field of view cannot be 270 deg.",
            "Write something from 10 deg to 180 deg.",
        ),
    ],
)
def test_a_mistake_is_told_with_what_to_write(tmp_path: Path, more: str, sentence: str, help_text: str | None) -> None:
    with pytest.raises(LanguageError) as caught:
        read(tmp_path, more)
    found = texts.only(caught.value)
    assert found.sentence == sentence
    assert help_text is None or found.help == help_text
