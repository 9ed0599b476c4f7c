"""Starting a run: the backend found by its entry point, the journal made, the host given both, and all closed again."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from datetime import datetime, time, timedelta
from importlib.metadata import entry_points, version
from pathlib import Path

from backends.contract import Backend, BackendError, Line, Setup
from runner.host.board import Board
from runner.host.host import Host
from runner.host.view import Health, View
from runner.journal.errors import JournalError
from runner.journal.header import RunHeader, person_and_host
from runner.journal.writer import JournalWriter
from runner.language.mission import Mission, Source
from runner.machine.codec import to_json
from runner.machine.needs import abilities_needed
from runner.machine.table import Ending, Machine
from runner.site.values import Conditions

BACKENDS = "trundle.backends"
"""The group of entry points in which a backend is found."""


class LaunchError(Exception):
    """The run cannot begin, in a sentence for the person who asked for it."""


class RunError(Exception):
    """The robot or the record failed during the run, in a sentence. The robot was told to halt."""


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


def make_backend(order: Order, begins: datetime) -> Backend:
    """The backend of that name, made but not opened. LaunchError where there is none, or where it lacks an ability."""
    found = entry_points(group=BACKENDS, name=order.backend)
    if not found:
        known = ", ".join(sorted(point.name for point in entry_points(group=BACKENDS)))
        raise LaunchError(f'There is no backend "{order.backend}". Installed: {known}.')
    mission = order.mission
    setup = Setup(mission.site, mission.robot, mission.start.pose, order.conditions, order.seed, begins, order.line)
    try:
        backend: Backend = next(iter(found)).load()(setup)
        able = {ability.value for ability in backend.capabilities}
    except BackendError as error:
        raise LaunchError(str(error)) from error
    lacking = abilities_needed(order.machine) - able
    if lacking:
        raise LaunchError(f"The robot cannot do what the retry rules ask for: {', '.join(sorted(lacking))}.")
    return backend


def begins_at(conditions: Conditions, today: datetime) -> datetime:
    """The simulated wall time at which a run begins: the conditions' time of day, today, without a zone."""
    return datetime.combine(today.date(), time()) + timedelta(seconds=conditions.begins_at)


def carry_out(order: Order, folder: Path, board: Board, after_turn: Callable[[], None]) -> Ending:
    """Run a mission to its end, in this thread, with its record in `folder`.

    `after_turn` is called in this thread after each turn of the host. LaunchError before anything moved; RunError
    where the robot or the record failed. Whatever ends the run, the last view on the board says that it ended.
    """
    created = datetime.now().astimezone()
    begins = begins_at(order.conditions, created)
    header = _header(order, folder, created, begins)
    backend = make_backend(with_session(order, header), begins)
    try:
        with JournalWriter.create(folder, header, _sources(order), to_json(order.machine)) as journal:
            backend.open()
            try:
                return Host(order.machine, backend, journal, board, order.pace, after_turn).run()
            finally:
                backend.close()
    except JournalError as error:
        raise _trouble(board, f"The record cannot be written: {error}") from error
    except BackendError as error:
        raise _trouble(board, str(error)) from error
    except Exception as error:
        _trouble(board, f"{type(error).__name__}: {error}")
        raise


def with_session(order: Order, header: RunHeader) -> Order:
    """The order with the run's own name on its line: the same after a restart of this run, and that of no other."""
    if order.line is None:
        return order
    session = f"{header.run_id} on {header.host} at {header.created.isoformat()}"
    return replace(order, line=replace(order.line, session=session))


def _trouble(board: Board, sentence: str) -> RunError:
    last = board.view() or View(0.0, "00:00:00", Health.STARTING, "")
    board.post_view(replace(last, health=Health.ENDED, reason=sentence, outcome="broken off"))
    return RunError(sentence)


def _header(order: Order, folder: Path, created: datetime, begins: datetime) -> RunHeader:
    person, host = person_and_host()
    return RunHeader(
        run_id=folder.name,
        mission=order.mission.name,
        site=order.mission.site.name,
        robot=order.mission.robot.name,
        created=created,
        begins=begins,
        backend=order.backend,
        seed=order.seed,
        conditions=order.conditions.name,
        pace="max" if order.pace is None else f"{order.pace:g}",
        version=version("trundle"),
        person=person,
        host=host,
    )


def _sources(order: Order) -> tuple[Source, ...]:
    extra = () if order.conditions_source is None else (order.conditions_source,)
    return (*order.mission.sources, *extra)
