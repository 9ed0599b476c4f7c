"""Missions from Python: load or read one, compile it, and run it on a backend, with what happens as an iterator.

    import runner

    mission = runner.load("missions/evening-round.yaml")
    machine = runner.compile(mission)
    run = runner.run(machine, runner.simulator(mission, seed=3))
    for happened in run:
        if isinstance(happened.what, runner.Asked):
            run.answer("yes")
    print(run.ending)

It is the same engine that `trundle run` uses, without the record, the screens and the care of an unattended run; for
those, write a mission file and use the command. Nothing here waits for anybody: a simulated run goes as fast as it can.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from datetime import datetime, timedelta
from os import PathLike
from pathlib import Path
from typing import Any

from backends.contract import Backend, Setup
from runner.engine.advance import advance
from runner.engine.state import EngineState, initial_state
from runner.engine.values import Answer, Asked, Begin, Command, Input, LegEnded, Note, Operator, Tick
from runner.engine.watching import next_deadline
from runner.host.launch import LaunchError, make_backend
from runner.host.translation import SENDERS, to_input
from runner.language.diagnostics import LanguageError
from runner.language.mission import Mission
from runner.language.reader import load_mission, read_mission
from runner.machine.compiler import compile_mission
from runner.machine.table import Ending, Event, Machine
from runner.site.values import Conditions, RobotDescription, Site

__all__ = [
    "Asked", "Ending", "Happened", "LanguageError", "LaunchError", "LegEnded", "Machine", "Mission", "Running",
    "compile", "load", "read", "run", "simulator",
]  # fmt: skip

SLICE_S = 0.5
"""How long a backend is left to itself at a stretch, seconds of its clock."""


def load(path: str | PathLike[str]) -> Mission:
    """The mission in a file, with its site and robot. LanguageError with every problem of the files."""
    return load_mission(Path(path))


def read(text: str, site: Site, robot: RobotDescription) -> Mission:
    """The mission in a text, on a site and for a robot at hand; the files it names are not opened. LanguageError."""
    return read_mission(text, "<text>", site, robot)


def compile(mission: Mission) -> Machine:  # noqa: A001 - the word for it, in a namespace of its own
    """The machine of a mission."""
    return compile_mission(mission)


def simulator(mission: Mission, *, conditions: Conditions | None = None, seed: int = 1) -> Backend:
    """The simulated robot at the mission's start. The same seed gives the same run. LaunchError if it cannot be had."""
    given = conditions or Conditions()
    begins = datetime(2026, 1, 5) + timedelta(seconds=given.begins_at)
    setup = Setup(mission.site, mission.robot, mission.start.pose, given, seed, begins)
    return make_backend("sim", setup, compile_mission(mission))


@dataclass(frozen=True, slots=True)
class Happened:
    """Something that happened at `stamp`, seconds since the run began: a command to the robot, or a note about the run
    (a leg that ended, an incident, a question, the end)."""

    stamp: float
    what: Command | Note


def run(machine: Machine, backend: Backend, *, seed: int = 1) -> Running:
    """Run a machine on a backend, which is opened now and closed at the end. `seed` orders shuffled visits."""
    return Running(machine, backend, seed)


@dataclass(slots=True)
class Running:
    """A run under way: iterate over it, and it goes on. Left before its end (`close`), the robot is halted.

    What a person would do is done by `hold`, `release`, `skip`, `abort` and `answer`, between any two steps of the
    iteration. `state` is the engine's; `ending` is None until the run has ended.
    """

    machine: Machine
    backend: Backend
    seed: int = 1
    who: str = "program"
    state: EngineState = field(init=False)
    _asked: list[tuple[Event | None, str]] = field(init=False, default_factory=list)
    _steps: Iterator[Happened] = field(init=False)

    def __post_init__(self) -> None:
        self.state = initial_state(self.machine)
        self._steps = self._live()

    @property
    def ending(self) -> Ending | None:
        """How the mission ended."""
        return self.state.ended

    def __iter__(self) -> Iterator[Happened]:
        return self._steps

    def __next__(self) -> Happened:
        return next(self._steps)

    def close(self) -> None:
        """Leave the run: the robot is told to halt, and the backend is closed."""
        steps: Any = self._steps
        steps.close()

    def hold(self) -> None:
        """Halt the robot until `release`."""
        self._asked.append((Event.HOLD, ""))

    def release(self) -> None:
        """Let a held robot go on."""
        self._asked.append((Event.RELEASE, ""))

    def skip(self) -> None:
        """Go on to the next step."""
        self._asked.append((Event.SKIP, ""))

    def abort(self) -> None:
        """Halt the robot and end the mission. It is a request to software, not an emergency stop."""
        self._asked.append((Event.ABORT, ""))

    def answer(self, word: str) -> None:
        """Answer the question that is open."""
        self._asked.append((None, word))

    def _live(self) -> Iterator[Happened]:
        self.backend.open()
        try:
            clock = self.backend.clock
            wall = clock.wall()
            since_midnight = wall.hour * 3600.0 + wall.minute * 60.0 + wall.second + wall.microsecond / 1e6
            yield from self._give(Begin(clock.now(), since_midnight, self.seed))
            while self.state.ended is None:
                yield from self._turn()
        finally:
            self.backend.halt()
            self.backend.close()

    def _turn(self) -> Iterator[Happened]:
        clock = self.backend.clock
        while self._asked:
            event, word = self._asked.pop(0)
            now = clock.now()
            yield from self._give(Answer(now, word, self.who) if event is None else Operator(now, event, self.who))
        deadline = next_deadline(self.machine, self.state)
        until = clock.now() + SLICE_S if deadline is None else min(deadline, clock.now() + SLICE_S)
        reports = self.backend.reports(until)
        for report in reports:
            yield from self._give(to_input(report))
        if deadline is not None and (clock.now() >= deadline or (not reports and until >= deadline)):
            yield from self._give(Tick(max(deadline, clock.now())))

    def _give(self, given: Input) -> Iterator[Happened]:
        self.state, effects = advance(self.machine, self.state, given)
        for effect in effects:
            if (send := SENDERS.get(type(effect))) is not None:
                send(self.backend, effect)
        yield from (Happened(given.stamp, effect) for effect in effects)
