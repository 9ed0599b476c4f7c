"""A night of random faults in virtual time, from one seed: the real host, engine and journal, and a robot that fails.

`python -m tests.faults.nights FIRST COUNT` goes through so many nights and says what became of them. A night is judged
by what the robot was told and by its record, never by what the host believes of itself:
- an abort is followed by a halt before anything else, within the bound;
- the robot is never sent a goal that the record does not hold, nor one while the mission is held, nor one twice;
- time goes on unless the mission is held, and the run ends;
- every entry that was acknowledged is there, and the engine agrees with every entry.
"""

from __future__ import annotations

import math
import resource
import signal
import sqlite3
import sys
import tempfile
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from datetime import datetime, timedelta
from pathlib import Path
from random import Random

from backends.contract import (
    ActionReport,
    BackendError,
    Capability,
    Clock,
    Goal,
    GoalReport,
    GoalStatus,
    Report,
    Telemetry,
)
from runner.engine.state import initial_state
from runner.host.board import Board, Wish
from runner.host.distress import Distress, RunError
from runner.host.hooks import Teller
from runner.host.host import Host
from runner.host.plan import Care
from runner.journal.reader import open_record
from runner.journal.replay import verify
from runner.journal.schema import FILE_NAME
from runner.journal.writer import JournalWriter
from runner.language.mission import Ask, Otherwise
from runner.machine.codec import to_json
from runner.machine.compiler import compile_mission
from runner.machine.table import Event, Machine
from runner.site.values import Pose
from tests.builders import FAR, HOME, SIDE, go, mark, mission, repeat, rule, visit, wait
from tests.journal.records import header

BEGINS = datetime(2026, 12, 1, 18)
LASTS_S = 3600.0
"""After so long somebody aborts what has not ended."""
ABORT_BOUND_S = 1.0
"""Virtual seconds within which an abort must have halted the robot: one slice of a host without a pace."""
TURNS_MOST = 60_000
STUCK_TURNS = 60
MEMORY = "/dev/shm" if Path("/dev/shm").is_dir() else None  # noqa: S108  a night commits thousands of times
ROOM_FOR_NOTES = 16_384
"""Bytes that a file may have while the disk is full: notes fit, the write-ahead log does not."""


class FaultyClock:
    """Virtual time whose wall clock is set now and then."""

    virtual = True

    def __init__(self) -> None:
        self.seconds = 0.0
        self.moved = 0.0

    def now(self) -> float:
        return self.seconds

    def wall(self) -> datetime:
        return BEGINS + timedelta(seconds=self.seconds + self.moved)


@dataclass(slots=True)
class FaultyRobot:
    """A robot that drives straight, on a line that is cut, with news that fail to come. `told` is all it was told."""

    chance: Random
    path: Path
    clock: FaultyClock = field(default_factory=FaultyClock)
    told: list[tuple[float, str]] = field(default_factory=list)
    held: Callable[[], bool] = lambda: False
    ended: Callable[[], bool] = lambda: False
    wrong: list[str] = field(default_factory=list)
    cut_until: float = -1.0
    silent_until: float = -1.0
    lost_until: float = -1.0
    news: list[Report] = field(default_factory=list)
    goal: Goal | None = None
    fate: GoalStatus | None = None
    fate_at: float = 0.0
    begun: list[int] = field(default_factory=list)
    pose: tuple[float, float] = (1.5, 1.5)
    driven: float = 0.0

    capabilities = frozenset(Capability)

    def preparation(self) -> str:
        return ""

    def open(self) -> None:
        """Always open."""

    def close(self) -> None:
        """Never closed."""

    def go(self, goal: Goal) -> None:
        self._reached()
        self.told.append((self.clock.seconds, f"go {goal.id}"))
        if self.held():
            self.wrong.append(f"goal {goal.id} was sent while the mission was held")
        if goal.id <= max(self.begun, default=0):
            self.wrong.append(f"goal {goal.id} was sent after {max(self.begun)}")
        if not self._recorded(goal.id):
            self.wrong.append(f"goal {goal.id} was sent before it was recorded")
        self.begun.append(goal.id)
        self.goal = goal
        self.fate = self.chance.choice([None] * 5 + [GoalStatus.FAILED, GoalStatus.NO_ROUTE, GoalStatus.HALTED])
        self.fate_at = self.clock.seconds + self.chance.uniform(0.0, 6.0)
        if self.chance.random() < 0.1:  # stuck: nothing comes of it
            self.fate, self.fate_at = None, math.inf
        self.news.append(GoalReport(self.clock.seconds, goal.id, GoalStatus.ACCEPTED))

    def halt(self) -> None:
        self._reached()
        self.told.append((self.clock.seconds, "halt"))
        if self.goal is not None:
            self._end(GoalStatus.HALTED)

    def clear(self, action_id: int, _radius: float) -> None:
        self._act(action_id)

    def replan(self, action_id: int) -> None:
        self._act(action_id)

    def ease_back(self, action_id: int, _distance: float) -> None:
        self._act(action_id)

    def relocate(self, action_id: int, _pose: Pose | None) -> None:
        self._act(action_id)

    def charge(self) -> None:
        self._reached()

    def reports(self, until: float) -> Sequence[Report]:
        if not self.news:
            self._advance(min(until, self.clock.seconds + 0.5))
        self._reached()
        news, self.news = self.news, []
        return news

    def _act(self, action_id: int) -> None:
        self._reached()
        self.told.append((self.clock.seconds, "action"))
        if self.fate_at == math.inf and self.chance.random() < 0.5:
            self.fate_at = self.clock.seconds
        if self.chance.random() < 0.9:  # else it is never answered
            self.news.append(ActionReport(self.clock.seconds, action_id, self.chance.random() < 0.8))

    def _advance(self, until: float) -> None:
        seconds, self.clock.seconds = max(until - self.clock.seconds, 0.0), max(until, self.clock.seconds)
        if self.clock.seconds < self.silent_until:
            return
        if self.goal is not None:
            self._drive(self.goal, seconds)
        self.news.append(self._telemetry())

    def _drive(self, goal: Goal, seconds: float) -> None:
        if self.fate is not None and self.clock.seconds >= self.fate_at:
            self._end(self.fate)
        elif self.fate_at != math.inf:
            left = math.dist(self.pose, (goal.pose.x, goal.pose.y))
            step = min(0.9 * seconds, left)
            share = step / left if left > 0.0 else 0.0
            self.pose = (
                self.pose[0] + share * (goal.pose.x - self.pose[0]),
                self.pose[1] + share * (goal.pose.y - self.pose[1]),
            )
            self.driven += step
            if left - step < 1e-9:
                self._end(GoalStatus.ARRIVED)

    def _end(self, status: GoalStatus) -> None:
        assert self.goal is not None
        self.news.append(GoalReport(self.clock.seconds, self.goal.id, status))
        self.goal = None

    def _telemetry(self) -> Telemetry:
        remaining = None if self.goal is None else math.dist(self.pose, (self.goal.pose.x, self.goal.pose.y))
        spread = 9.0 if self.clock.seconds < self.lost_until else 0.03
        pose = Pose(*self.pose, 0.0)
        return Telemetry(self.clock.seconds, pose, spread, 0.5, 0.0, 0.8, self.driven, remaining, 1, (), ())

    def _reached(self) -> None:
        if self.clock.seconds < self.cut_until:
            raise BackendError("The line to the robot is cut.")

    def _recorded(self, goal_id: int) -> bool:
        with sqlite3.connect(f"file:{self.path}?mode=ro", uri=True) as connection:
            query = "SELECT count(*) FROM entry WHERE name = 'go' AND body LIKE ?"
            return bool(connection.execute(query, (f'{{"goal_id":{goal_id},%',)).fetchone()[0])


@dataclass(slots=True)
class Fates:
    """Throws faults and wishes at a run, once a turn, and keeps count of what must come of them."""

    chance: Random
    robot: FaultyRobot
    board: Board
    rate: float
    turns: int = 0
    disk_full: bool = False
    thrown: Counter[str] = field(default_factory=Counter)
    aborted_at: tuple[float, int] | None = None
    acknowledged: list[str] = field(default_factory=list)
    stuck: int = 0
    before: float = -1.0
    said: int = 0

    def turn(self) -> None:
        """After each turn of the host, and while it waits in trouble."""
        self.turns += 1
        if self.turns >= TURNS_MOST:
            raise SystemExit("the run does not end")  # nothing less gets past a host that lives through faults
        self._see_time_go_on()
        clock = self.robot.clock
        if clock.seconds >= LASTS_S or self.turns >= TURNS_MOST // 2:
            self._mend()
            self._abort()
        elif self.chance.random() < self.rate:
            fault = self.chance.choice(FAULTS)
            self.thrown[fault] += 1
            getattr(self, f"_{fault}")()
        elif self.chance.random() < 0.02:  # somebody comes by and puts things right
            self._mend()
            self._wish(Event.RELEASE)

    def _see_time_go_on(self) -> None:
        waiting = self.robot.held() or self.disk_full or self.robot.clock.seconds < self.robot.cut_until
        self.stuck = 0 if waiting or self.robot.clock.seconds > self.before else self.stuck + 1
        self.before = self.robot.clock.seconds
        if self.stuck == STUCK_TURNS:
            self._note("time stands still although nobody holds the mission")

    def _note(self, wrong: str) -> None:
        """For the judge. Raised here, it would be one more fault for the host to live through."""
        self.robot.wrong.append(wrong)

    def _mend(self) -> None:
        robot = self.robot
        robot.cut_until = robot.silent_until = robot.lost_until = -1.0
        self._limit(None)

    def _cut(self) -> None:
        self.robot.cut_until = self.robot.clock.seconds + self.chance.uniform(0.5, 20.0)

    def _silence(self) -> None:
        self.robot.silent_until = self.robot.clock.seconds + self.chance.uniform(5.0, 90.0)

    def _lose(self) -> None:
        self.robot.lost_until = self.robot.clock.seconds + self.chance.uniform(5.0, 120.0)

    def _fill_disk(self) -> None:
        self._limit(ROOM_FOR_NOTES)

    def _step_clock(self) -> None:
        self.robot.clock.moved += self.chance.choice([-3600.0, 3600.0, 2.0, -2.0, 0.4])

    def _flood(self) -> None:
        for _ in range(1200):
            self.board.post_wish(Wish(None, "flood", "noise"))

    def _hold(self) -> None:
        self._wish(Event.HOLD)

    def _release(self) -> None:
        self._wish(Event.RELEASE)

    def _skip(self) -> None:
        self._wish(Event.SKIP)

    def _answer(self) -> None:
        self.board.post_wish(Wish(Event.ANSWERED, "night desk", self.chance.choice(["yes", "no", "perhaps"])))

    def _say(self) -> None:
        self.said += 1
        text = f"remark {self.said}"
        self.board.post_wish(Wish(None, "night desk", text, lambda accepted, _: self._said(accepted, text)))

    def _said(self, accepted: bool, text: str) -> None:
        if accepted:
            self.acknowledged.append(text)

    def _rarely_abort(self) -> None:
        if self.chance.random() < 0.05:
            self._abort()

    def _abort(self) -> None:
        if self.aborted_at is None and not self.robot.ended():
            self.aborted_at = (self.robot.clock.seconds, len(self.robot.told))
        self._wish(Event.ABORT)

    def _wish(self, event: Event) -> None:
        self.board.post_wish(Wish(event, "night desk"))

    def _limit(self, size: int | None) -> None:
        self.disk_full = size is not None
        _, most = resource.getrlimit(resource.RLIMIT_FSIZE)
        resource.setrlimit(resource.RLIMIT_FSIZE, (most if size is None else size, most))


FAULTS = ("cut", "silence", "lose", "fill_disk", "step_clock", "flood", "hold", "release", "skip", "answer", "say")
FAULTS += ("rarely_abort",)


def machine_of_the_night() -> Machine:
    under = rule(tries=3, give_up_after=200.0)
    ask = Ask(mark(), "Taken?", ("yes", "no"), 20.0, "no")
    round_ = visit([FAR, SIDE], under, otherwise=Otherwise.SKIP)
    home = go(HOME, under, within=120.0, otherwise=Otherwise.SKIP)
    return compile_mission(mission(repeat(round_, ask, home, wait(5.0), times=6), end_by=20 * 3600.0))


MACHINE = machine_of_the_night()


def night(seed: int, folder: Path) -> tuple[str, Counter[str]]:
    """One night. AssertionError, in words, where something that must never happen did; else how it ended."""
    signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    chance = Random(seed)  # noqa: S311
    board = Board("night desk")
    robot = FaultyRobot(chance, folder / FILE_NAME)
    fates = Fates(chance, robot, board, rate=chance.choice([0.005, 0.02, 0.08]))
    distress = Distress(folder, "a night", Care(patience=None), Teller(folder))
    journal = JournalWriter.create(folder, header(folder.name), (), to_json(MACHINE))
    clock: Clock = robot.clock
    assert clock.virtual
    host = Host(
        MACHINE,
        initial_state(MACHINE),
        robot,
        journal,
        board,
        distress,
        after_turn=fates.turn,
        held_pace=None,
        rest=0.0,
    )
    robot.held = lambda: host.state.held is not None
    robot.ended = lambda: host.state.ended is not None
    try:
        how = host.run().value
    except RunError as error:
        how = f"in trouble: {distress.kind}"
        gave_up = fates.aborted_at is None and "not have been told" not in str(error)
    else:
        gave_up = False
    finally:
        cut = robot.clock.seconds < robot.cut_until
        fates._mend()
        journal.close()
    assert not gave_up, f"the run gave up: {how}"
    judge(folder, robot, fates, cut)
    return how, fates.thrown


def judge(folder: Path, robot: FaultyRobot, fates: Fates, cut: bool) -> None:
    """What must hold of every night. With the line `cut` at its end, a halt could not arrive, and the host says so."""
    assert not robot.wrong, robot.wrong
    assert len(robot.begun) == len(set(robot.begun)), "a goal was driven twice"
    if fates.aborted_at is not None:
        at, before = fates.aborted_at
        after = robot.told[before:]
        assert after or cut, "an abort was not followed by anything"
        assert not after or after[0][1] == "halt", f"an abort was followed by {after[0][1]}"
        assert not after or after[0][0] - at <= ABORT_BOUND_S, "the halt came too late"
        assert all(word == "halt" for _, word in after), "something was sent after an abort"
    with open_record(folder) as record:
        verdict = verify(record)
        assert verdict.sound, verdict
        remarks = [entry.body for entry in record.entries(names=("remarked",))]
    missing = [text for text in fates.acknowledged if not any(f'"{text}"' in body for body in remarks)]
    assert not missing, f"acknowledged and lost: {missing}"


def main(first: int, count: int) -> None:
    ends: Counter[str] = Counter()
    thrown: Counter[str] = Counter()
    for seed in range(first, first + count):
        with tempfile.TemporaryDirectory(prefix="night", dir=MEMORY) as name:
            try:
                how, faults = night(seed, Path(name) / "run")
            except AssertionError:
                print(f"night {seed}:", flush=True)
                raise
        ends[how] += 1
        thrown += faults
    print(f"{count} nights from seed {first}. They ended: {dict(ends)}. Thrown: {dict(thrown)}")


if __name__ == "__main__":
    main(int(sys.argv[1]), int(sys.argv[2]))
