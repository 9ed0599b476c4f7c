"""Owning a run: the backend found by its entry point, the journal opened, the host given both, and all closed again.

A run begins (`carry_out`, `begin`), or it is picked up from its record after its process died (`pick_up`). Either way
everything that belongs to owning it is here: the control socket, the hooks, the service manager, and the last view,
which says that it ended whatever ended it.
"""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from datetime import datetime, time, timedelta
from importlib.metadata import entry_points, version
from pathlib import Path

from backends.contract import Backend, BackendError, Line, Setup
from runner.engine.state import EngineState, initial_state
from runner.engine.values import Command, Go, Halt, StartCharging
from runner.host.board import Board
from runner.host.clocks import seconds_of_day
from runner.host.continued import continued
from runner.host.control import ControlServer
from runner.host.distress import ABORTED, Distress, RunError
from runner.host.hooks import Teller
from runner.host.host import Host
from runner.host.plan import Care, Plan, later, plan_of, plan_to_json
from runner.host.service import ServiceManager
from runner.host.view import FeedLine, Health, View, Weight
from runner.host.viewing import clock_text
from runner.journal.errors import JournalError
from runner.journal.header import RunHeader, person_and_host
from runner.journal.reader import Record, Status, open_record
from runner.journal.replay import machine_of, state_at_end
from runner.journal.writer import JournalWriter
from runner.language.mission import Mission, Source
from runner.machine.codec import to_json
from runner.machine.needs import abilities_needed
from runner.machine.table import Ending, Machine
from runner.site.values import Conditions

__all__ = ["LaunchError", "Order", "RunError", "begin", "carry_out", "make_backend", "pick_up", "planned"]

BACKENDS = "trundle.backends"
"""The group of entry points in which a backend is found."""


class LaunchError(Exception):
    """The run cannot begin, in a sentence for the person who asked for it."""


@dataclass(frozen=True, slots=True)
class Order:
    """A run as asked for. `pace` is virtual seconds per wall second, None for as fast as it goes."""

    mission: Mission
    machine: Machine
    conditions: Conditions
    conditions_source: Source | None
    seed: int
    pace: float | None
    backend: str = "sim"
    line: Line | None = None
    """The way to a robot on a socket, for a backend that needs one."""
    care: Care = field(default_factory=Care)


@dataclass(frozen=True, slots=True)
class Errand:
    """All that a process needs to begin a run and own it: an order with everything looked up."""

    plan: Plan
    machine: Machine
    sources: tuple[Source, ...]
    created: datetime


def planned(order: Order, run_id: str) -> Errand:
    """The order, with everything looked up, to be begun now as the run of that name."""
    created = datetime.now().astimezone()
    mission = order.mission
    begins = begins_at(order.conditions, created)
    line = order.line
    if line is not None:  # the run's own name: the same after a restart of this run, and that of no other
        line = replace(line, session=f"{run_id} on {person_and_host()[1]} at {created.isoformat()}")
    setup = Setup(mission.site, mission.robot, mission.start.pose, order.conditions, order.seed, begins, line)
    extra = () if order.conditions_source is None else (order.conditions_source,)
    plan = Plan(mission.name, setup, order.backend, order.pace, order.care)
    return Errand(plan, order.machine, (*mission.sources, *extra), created)


def begins_at(conditions: Conditions, today: datetime) -> datetime:
    """The simulated wall time at which a run begins: the conditions' time of day, today, without a zone."""
    return datetime.combine(today.date(), time()) + timedelta(seconds=conditions.begins_at)


def make_backend(name: str, setup: Setup, machine: Machine) -> Backend:
    """The backend of that name, made but not opened. LaunchError where there is none, or where it lacks an ability."""
    found = entry_points(group=BACKENDS, name=name)
    if not found:
        known = ", ".join(sorted(point.name for point in entry_points(group=BACKENDS)))
        raise LaunchError(f'There is no backend "{name}". Installed: {known}.')
    try:
        backend: Backend = next(iter(found)).load()(setup)
        lacking = abilities_needed(machine) - {ability.value for ability in backend.capabilities}
    except (BackendError, ValueError) as error:
        raise LaunchError(str(error)) from error
    if lacking:
        raise LaunchError(f"The robot cannot do what the mission asks for: {', '.join(sorted(lacking))}.")
    return backend


def carry_out(order: Order, folder: Path, board: Board, after_turn: Callable[[], None]) -> Ending:
    """Run a mission to its end, in this thread, with its record in `folder`. See `begin`."""
    return begin(planned(order, folder.name), folder, board, after_turn)


def begin(errand: Errand, folder: Path, board: Board, after_turn: Callable[[], None]) -> Ending:
    """Run a mission to its end, in this thread, with its record in `folder`.

    `after_turn` is called in this thread after each turn of the host. LaunchError before anything moved; RunError
    where the robot or the record failed. Whatever ends the run, the last view on the board says that it ended.
    """
    plan, machine = errand.plan, errand.machine
    with _saying_the_end(board):
        backend = make_backend(plan.backend, plan.setup, machine)
        header = _header(errand, folder)
        with JournalWriter.create(folder, header, errand.sources, to_json(machine), plan_to_json(plan)) as journal:
            owner = _Owner(folder, board, plan, machine, journal, after_turn)
            return owner.own(backend, initial_state(machine), lambda host: host.run())


@dataclass(frozen=True, slots=True)
class Left:
    """A run as its process left it, read off its record. `again` is what the robot is sent once more."""

    plan: Plan
    machine: Machine
    state: EngineState
    again: tuple[Command, ...]
    stamp: float
    down: float
    times: int

    @property
    def sentence(self) -> str:
        """What picking it up will do, for the person who does it."""
        step = None if self.state.step is None else self.machine.steps[self.state.step]
        where = "before its first step" if step is None else f'in the step "{step.text}" (line {step.mark.line})'
        goal = next((command for command in self.again if isinstance(command, Go)), None)
        does = f"goal {goal.goal_id}, {goal.place}, is sent again" if goal else "no goal was under way"
        return f"The run goes on {where} at {self.stamp:.1f} s; {does}."


def left(folder: Path) -> Left:
    """How a run was left. JournalError, in a sentence, where it cannot or need not be picked up."""
    with open_record(folder) as record:
        if record.status is Status.RUNNING:
            raise JournalError(f"The run {folder.name} goes on: its process lives.")
        if (folder / ABORTED).exists():
            raise JournalError(f"{folder.name} was aborted by a person while its record could not be written.")
        state = state_at_end(record)
        if record.status is Status.ENDED or state.ended is not None:
            raise JournalError(f"The mission of {folder.name} has ended. There is nothing to pick up.")
        return Left(
            plan_of(record),
            machine_of(record),
            state,
            _sent_again(record, state),
            record.last_stamp(),
            _down(folder, record),
            sum(1 for _ in record.entries(names=("picked up",))) + 1,
        )


def pick_up(run: Left, folder: Path, board: Board, after_turn: Callable[[], None]) -> Ending:
    """Go on with a run whose process died, at the same step and with the same goal id. Raises as `begin`.

    A real robot has kept its place, its goal and its own account of it. A simulated world died with the process; it is
    built anew, as late as the run is, with the robot where it last believed to be.
    """
    plan, state = run.plan, run.state
    seen = state.seen
    with _saying_the_end(board):
        setup = later(plan.setup, run.stamp, seen.pose if seen else None, run.times)
        try:
            backend = make_backend(plan.backend, setup, run.machine)
        except LaunchError:  # where it believed to be, it would stand in a wall
            backend = make_backend(plan.backend, replace(setup, start=plan.setup.start), run.machine)
        with JournalWriter.resume(folder) as journal:
            owner = _Owner(folder, board, plan, run.machine, journal, after_turn)
            going_on = continued(backend, run.stamp, seen.driven if seen else 0.0)
            who, down = person_and_host()[0], 0.0 if backend.clock.virtual else run.down
            return owner.own(going_on, state, lambda host: host.go_on(who, down, run.again))


def _sent_again(record: Record, state: EngineState) -> tuple[Command, ...]:
    """What the robot is about, as the record has it: it may or may not have been sent before the process died."""
    newest = record.newest(("go", "halt", "start charging"))
    last = newest.value if newest is not None else Halt()
    if isinstance(last, StartCharging) or (isinstance(last, Go) and last.goal_id == state.goal):
        return (last,)
    return (Halt(),)


def _down(folder: Path, record: Record) -> float:
    """Wall seconds since the record was last written."""
    newest = max(path.stat().st_mtime for path in folder.glob(f"{record.path.name}*"))
    return max(datetime.now().timestamp() - newest, 0.0)


@dataclass(slots=True)
class _Owner:
    """What owning a run takes, whether it begins or goes on."""

    folder: Path
    board: Board
    plan: Plan
    machine: Machine
    journal: JournalWriter
    after_turn: Callable[[], None]
    service: ServiceManager = field(default_factory=ServiceManager)

    def own(self, backend: Backend, state: EngineState, live: Callable[[Host], Ending]) -> Ending:
        """Open the robot, serve the control socket, live, and tell how it ended."""
        teller = Teller(self.folder)
        distress = Distress(self.folder, self.plan.mission, self.plan.care, teller)
        outcome = "broken off"
        try:
            self._say(backend.preparation())
            with _opened(backend):
                host = self._host(backend, state, distress)
                server = ControlServer(self.folder, self.board, host.gate)
                host.alone = server.alone
                with server.serving():
                    self.service.ready()
                    with _saying_the_end(self.board):
                        ending = live(host)
            outcome = ending.value
            return ending
        except (RunError, JournalError) as error:
            outcome = str(error)
            if not distress.kind:
                distress.begin("robot", str(error), self._stamp())
            raise
        finally:
            self.service.stopping()
            distress.tell("end", outcome, outcome, self._stamp())
            teller.finish()

    def _host(self, backend: Backend, state: EngineState, distress: Distress) -> Host:
        def after_turn() -> None:
            self.service.alive()
            self.after_turn()

        plan = self.plan
        return Host(
            self.machine, state, backend, self.journal, self.board, distress, plan.setup.seed, plan.pace, after_turn
        )

    def _say(self, sentence: str) -> None:
        """Tell whoever waits for the run to begin what it takes time for."""
        if sentence:
            clock = clock_text(seconds_of_day(self.plan.setup.begins))
            self.board.post_line(FeedLine(0.0, clock, Weight.NOTICE, sentence))
            self.after_turn()

    def _stamp(self) -> float:
        view = self.board.view()
        return view.stamp if view else 0.0


@contextmanager
def _opened(backend: Backend) -> Iterator[None]:
    """The backend, open. RunError where it cannot be opened."""
    try:
        backend.open()
    except Exception as error:
        with contextlib.suppress(Exception):
            backend.close()
        raise RunError(f"The robot cannot be had: {error}") from error
    try:
        yield
    finally:
        with contextlib.suppress(Exception):  # what the run came to is known by now
            backend.close()


@contextmanager
def _saying_the_end(board: Board) -> Iterator[None]:
    """Whatever ends the run, the last view says that it ended."""
    try:
        yield
    except JournalError as error:
        _say_broken_off(board, f"The record cannot be written: {error}")
        raise
    except Exception as error:
        _say_broken_off(board, str(error) if isinstance(error, RunError | LaunchError) else repr(error))
        raise


def _say_broken_off(board: Board, sentence: str) -> None:
    last = board.view() or View(0.0, "00:00:00", Health.STARTING, "")
    if last.outcome is None:
        board.post_view(replace(last, health=Health.ENDED, reason=sentence, outcome="broken off"))


def _header(errand: Errand, folder: Path) -> RunHeader:
    person, host = person_and_host()
    setup, pace = errand.plan.setup, errand.plan.pace
    return RunHeader(
        run_id=folder.name,
        mission=errand.plan.mission,
        site=setup.site.name,
        robot=setup.robot.name,
        created=errand.created,
        begins=setup.begins,
        backend=errand.plan.backend,
        seed=setup.seed,
        conditions=setup.conditions.name,
        pace="max" if pace is None else f"{pace:g}",
        version=version("trundle"),
        person=person,
        host=host,
    )
