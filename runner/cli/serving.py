"""`trundle link serve`: a simulated robot as a process of its own, reached as a real one would be."""

from __future__ import annotations

import argparse
import os
import signal
import sys
import threading
import time
from collections.abc import Callable
from dataclasses import replace
from datetime import datetime
from importlib.metadata import entry_points
from pathlib import Path

import msgspec

from backends.contract import Backend, BackendError, Setup
from backends.link.adapter import Robot
from backends.link.behind import Behind
from backends.link.keys import public_of, read_allowed, read_secret
from backends.link.ledger import Kept
from backends.link.server import Listening, RobotServer
from backends.link.sockets import Keys
from runner.cli.exits import Exit
from runner.cli.reading import read, show_problems
from runner.site.values import Conditions, Pose

BACKENDS = "trundle.backends"
KEEP_EVERY_S = 0.2
"""Wall time between two notes of where the robot stands."""
SILENCE_S, SILENCE_WALL_S = 1.0, 0.05
"""The robot stops after so long without its controller: in its own time, but never less than so much wall time."""
TERM_S, TERM_MOST_S = 30.0, 600.0
"""The lease of a silent controller lasts so long: in wall time, because that is what its program needs to start again;
and no longer than the protocol allows, in the robot's time."""


class Place(msgspec.Struct, frozen=True):
    """What a simulated robot keeps over a restart."""

    pose: tuple[float, float, float]
    wall: str
    kept: Kept


def serve(arguments: argparse.Namespace) -> int:
    """Serve until SIGINT or SIGTERM."""
    setup = _setup(arguments)
    if setup is None:
        return Exit.MISTAKE
    keep = Path(arguments.keep) if arguments.keep else None
    before = _place_before(keep)
    if before is not None:
        setup = replace(setup, start=Pose(*before.pose), begins=datetime.fromisoformat(before.wall))
    backend = _backend(arguments.backend, setup)
    print("Making ready.", file=sys.stderr, flush=True)
    backend.open()
    clock = _clock(arguments.pace)
    adapter = Behind(backend, _robot(setup, backend, arguments.pace), setup.start, clock)
    keeper = Keeper(keep, adapter, backend, before.kept if before else Kept())
    server = RobotServer(adapter, _listening(arguments), clock, keeper.kept, keeper.keep)
    stopped = threading.Event()
    for number in (signal.SIGINT, signal.SIGTERM):
        signal.signal(number, lambda *_: stopped.set())
    print(f"{setup.robot.name} on {setup.site.name} is at {arguments.at}. Ctrl-C ends it.", flush=True)
    server.run(keeper.until(stopped))
    backend.close()
    _say_counts(server)
    return Exit.OK


def _say_counts(server: RobotServer) -> None:
    counts = server.side.counts
    print(f"served {counts.served}, refused: {counts.malformed} malformed, {counts.without_lease} without the lease, "
          f"{counts.lease_refused} for the lease, {counts.late} too late, "
          f"{server.gate.refused if server.gate else 0} not admitted")  # fmt: skip


def _setup(arguments: argparse.Namespace) -> Setup | None:
    found = read(arguments.mission)
    if found is None:
        return None
    if not 0.01 <= arguments.pace <= 1000.0:
        raise BackendError(f"{arguments.pace:g} is no pace: write a number from 0.01 to 1000.")
    from runner.host.launch import begins_at
    from runner.language.diagnostics import LanguageError
    from runner.language.examples import resolve_conditions
    from runner.language.reader import load_conditions_with_source

    mission, conditions = found[0], Conditions()
    if arguments.conditions is not None:
        try:
            conditions, _ = load_conditions_with_source(resolve_conditions(arguments.conditions), mission.site)
        except LanguageError as error:
            show_problems(error)
            return None
    begins = begins_at(conditions, datetime.now())
    return Setup(mission.site, mission.robot, mission.start.pose, conditions, arguments.seed, begins)


def _backend(name: str, setup: Setup) -> Backend:
    found = entry_points(group=BACKENDS, name=name)
    if not found:
        raise BackendError(f'There is no backend "{name}".')
    try:
        backend: Backend = next(iter(found)).load()(setup)
    except ValueError as error:
        raise BackendError(f"The robot cannot start: {error}") from None
    if not backend.clock.virtual:
        raise BackendError(f'The backend "{name}" has a time of its own; only simulated robots are served.')
    return backend


def _clock(pace: float) -> Callable[[], float]:
    began = time.monotonic()
    return lambda: (time.monotonic() - began) * pace


def _robot(setup: Setup, backend: Backend, pace: float) -> Robot:
    return Robot(
        name=setup.robot.name,
        abilities=frozenset(capability.value for capability in backend.capabilities),
        speed=setup.robot.speed,
        silence=min(5.0, max(SILENCE_S, SILENCE_WALL_S * pace)),
        term=min(TERM_MOST_S, TERM_S * max(1.0, pace)),
        site=setup.site.name,
        pace=pace,
        begins=setup.begins.isoformat(),
    )


def _listening(arguments: argparse.Namespace) -> Listening:
    if arguments.key is None:
        if arguments.allow is not None:
            raise BackendError("--allow needs --key: without a key of its own the robot admits everybody.")
        return Listening(arguments.at, insecure=arguments.insecure_line)
    if arguments.allow is None:
        raise BackendError("Say who is admitted: --allow PATH, a public key or a folder of them.")
    secret = read_secret(Path(arguments.key))
    return Listening(arguments.at, Keys(secret, public_of(secret)), read_allowed(Path(arguments.allow)))


def _place_before(path: Path | None) -> Place | None:
    if path is None or not path.exists():
        return None
    try:
        return msgspec.json.decode(path.read_bytes(), type=Place)
    except (OSError, msgspec.DecodeError) as error:
        raise BackendError(f"{path} cannot be used: {error}. Remove it to begin at the mission's start.") from None


class Keeper:
    """Notes where the robot stands and what its goals are: a few times a second, and before anything is promised."""

    def __init__(self, path: Path | None, adapter: Behind, backend: Backend, kept: Kept) -> None:
        self.kept = kept
        self._path = path
        self._adapter = adapter
        self._backend = backend
        self._next = 0.0

    def keep(self, kept: Kept) -> None:
        self.kept = kept
        self._write()

    def until(self, stopped: threading.Event) -> Keeper:
        """What the server asks each turn whether to stop; a good moment to write."""
        self._stopped = stopped
        return self

    def is_set(self) -> bool:
        if time.monotonic() >= self._next:
            self._next = time.monotonic() + KEEP_EVERY_S
            self._write()
        return self._stopped.is_set()

    def _write(self) -> None:
        if self._path is None:
            return
        pose = self._adapter.look().pose
        place = Place((pose.x, pose.y, pose.heading), self._backend.clock.wall().isoformat(), self.kept)
        beside = self._path.with_name(f"{self._path.name}.new")
        beside.write_bytes(msgspec.json.encode(place))
        os.replace(beside, self._path)
