"""The rules of the backend contract hold whatever is asked for, in whatever order, and however time is cut up."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from backends.contract import ActionReport, Goal, GoalReport, Report
from backends.sim.simulator import Simulator
from runner.site.values import Carton, DoorChange, Pose, Walkers
from tests.backends.sim.support import ENDS, HALL, TWO_ROOMS, Drive, start


@dataclass(frozen=True)
class Command:
    """One call on a backend, `after` seconds since the one before."""

    after: float
    name: str
    number: int
    pose: Pose


POSES = st.sampled_from([place.pose for place in TWO_ROOMS.places] + [Pose(7.0, 5.0, 0.0), Pose(5.0, 1.5, 1.0)])
COMMANDS = st.lists(
    st.builds(
        Command,
        after=st.sampled_from([0.0, 0.05, 0.1, 0.7, 3.0, 12.0]),
        name=st.sampled_from(["go", "go", "go again", "halt", "clear", "replan", "ease back", "relocate", "charge"]),
        number=st.integers(1, 5),
        pose=POSES,
    ),
    min_size=1,
    max_size=8,
)
SLICES = st.lists(st.floats(0.01, 5.0), min_size=1, max_size=5)
FEW = settings(max_examples=15, deadline=None, suppress_health_check=list(HealthCheck))
AFTERWARDS_S = 25.0


def world(seed: int = 5) -> Drive:
    return start(
        TWO_ROOMS,
        Pose(2.0, 2.0, 0.0),
        seed=seed,
        cartons=[Carton((5.0, 2.0), (0.4, 0.4), when_near=1.5, stays_s=10.0)],
        doors=[DoorChange("south door", 4.0, False), DoorChange("south door", 20.0, True)],
        walkers=[Walkers(3)],
    )


def carry_out(simulator: Simulator, command: Command, index: int) -> None:
    """`index` is the command's place in the list, of which its ids are made."""
    match command.name:
        case "go":
            simulator.go(Goal(index + 10, command.pose, 0.8))
        case "go again":
            simulator.go(Goal(command.number, command.pose, 0.8))
        case "halt":
            simulator.halt()
        case "clear":
            simulator.clear(index, 2.0)
        case "replan":
            simulator.replan(index)
        case "ease back":
            simulator.ease_back(index, 0.1 * command.number)
        case "relocate":
            simulator.relocate(index, None)
        case "charge":
            simulator.charge()


def play(commands: list[Command], slices: list[float], seed: int = 5) -> list[Report]:
    """Everything reported when the commands are given at their times and time is asked for in slices."""
    drive = world(seed)
    simulator = drive.simulator
    due, turn = 0.0, 0
    for index, command in enumerate([*commands, None]):
        due += AFTERWARDS_S if command is None else command.after
        while simulator.clock.now() < due:
            until = min(due, simulator.clock.now() + slices[turn % len(slices)])
            drive.reports.extend(simulator.reports(until))
            turn += 1
        if command is not None:
            carry_out(simulator, command, index)
    return drive.reports


@FEW
@given(COMMANDS)
def test_each_goal_ends_at_most_once_and_says_nothing_after_its_end(commands: list[Command]) -> None:
    over: set[int] = set()
    for report in play(commands, [5.0]):
        if isinstance(report, GoalReport):
            assert report.goal_id not in over
            if report.status in ENDS:
                over.add(report.goal_id)


@FEW
@given(COMMANDS)
def test_every_action_is_answered_exactly_once(commands: list[Command]) -> None:
    answered = Counter(report.action_id for report in play(commands, [5.0]) if isinstance(report, ActionReport))
    asked = [i for i, one in enumerate(commands) if one.name in ("clear", "replan", "ease back", "relocate")]
    assert answered == Counter(asked)


def test_an_action_numbered_zero_is_answered_when_the_robot_is_halted() -> None:
    drive = start(HALL, Pose(2, 4, 0))
    drive.simulator.ease_back(0, 0.5)
    drive.simulator.halt()
    answer = drive.until_answer(0, 2.0)
    assert answer is not None
    assert not answer.done


@FEW
@given(COMMANDS)
def test_stamps_never_fall(commands: list[Command]) -> None:
    stamps = [report.stamp for report in play(commands, [5.0])]
    assert stamps == sorted(stamps)


@FEW
@given(COMMANDS, SLICES)
def test_how_time_is_cut_up_changes_nothing(commands: list[Command], slices: list[float]) -> None:
    assert play(commands, slices) == play(commands, [AFTERWARDS_S])


@FEW
@given(COMMANDS, st.integers(0, 2**32))
def test_the_same_seed_gives_the_same_reports_to_the_bit(commands: list[Command], seed: int) -> None:
    assert repr(play(commands, [5.0], seed)) == repr(play(commands, [5.0], seed))


def test_another_seed_gives_other_reports() -> None:
    drive = [Command(0.0, "go", 1, TWO_ROOMS.places[2].pose)]
    assert play(drive, [5.0], 1) != play(drive, [5.0], 2)


def test_time_stands_where_it_was_asked_to_and_wall_time_goes_with_it() -> None:
    drive = world()
    begins = drive.simulator.clock.wall()
    drive.until(12.34)
    assert drive.simulator.clock.now() == 12.34
    assert (drive.simulator.clock.wall() - begins).total_seconds() == 12.34
    assert drive.simulator.reports(3.0) == []
    assert drive.simulator.clock.now() == 12.34
    assert drive.simulator.clock.virtual
