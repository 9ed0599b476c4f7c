"""What tests of the record share: a header, sources, telemetry, and one round written by hand."""

from __future__ import annotations

import json
from collections.abc import Iterable, Sequence
from datetime import datetime, timedelta, timezone
from pathlib import Path

from runner.engine.values import (
    Begin,
    Ended,
    Go,
    GoalNews,
    Halt,
    IncidentBegan,
    IncidentEnded,
    LegBegan,
    LegEnded,
    Operator,
    OperatorActed,
    RecoveryBegan,
    Replan,
    Seen,
    StepBegan,
    TryFailed,
)
from runner.journal.codec import Value
from runner.journal.header import RunHeader
from runner.journal.writer import JournalWriter
from runner.language.mission import Source
from runner.machine.table import Ending, Event, Outcome
from runner.site.values import Pose

SOURCES = (
    Source("evening.yaml", "mission: Evening specimen round\nsteps:\n  - go: ward east\n"),
    Source("sites/clinic.yaml", "site: Harbor Clinic\n"),
)

MACHINE = json.dumps(
    {
        "name": "Evening specimen round",
        "places": [
            {"name": "charging bay", "pose": {"x": 2.0, "y": 2.0, "heading": 0.0}},
            {"name": "ward east", "pose": {"x": 30.0, "y": 12.0, "heading": 1.5}},
            {"name": "laboratory", "pose": {"x": 12.0, "y": 20.0, "heading": 0.0}},
        ],
    }
)

Moment = tuple[float, Sequence[Value]]


def header(run_id: str = "evening-specimen-20261201-093000", person: str = "mara") -> RunHeader:
    return RunHeader(
        run_id=run_id,
        mission="Evening specimen round",
        site="Harbor Clinic",
        robot="small cart",
        created=datetime(2026, 12, 1, 9, 30, tzinfo=timezone(timedelta(hours=1))),
        begins=datetime(2026, 12, 1, 23, 58),
        backend="sim",
        seed=3,
        conditions="blocked corridor",
        pace="max",
        version="0.1.0",
        person=person,
        host="desk",
    )


def seen(stamp: float, x: float = 2.0, **changes: object) -> Seen:
    """Telemetry whose points are exact in float32."""
    values: dict[str, object] = {
        "stamp": stamp,
        "pose": Pose(x, 2.1, 0.3),
        "spread": 0.017,
        "speed": 0.61,
        "battery": 0.95 - stamp / 10_000,
        "driven": stamp * 0.5,
        "remaining": 7.25,
        "route_number": 1,
        "route": ((x, 2.0), (8.0, 2.5), (30.0, 12.0)),
        "obstacles": ((9.5, 2.25),),
    }
    return Seen(**{**values, **changes})  # type: ignore[arg-type]


def write_run(folder: Path, moments: Iterable[Moment], *, person: str = "mara", every: float = 1.0) -> Path:
    """Write a whole record: the moments, with telemetry every `every` seconds between them."""
    with JournalWriter.create(folder, header(folder.name, person), SOURCES, MACHINE) as writer:
        tick = 0.0
        for stamp, values in moments:
            while tick <= stamp:
                writer.track(seen(tick, x=tick % 40.0))
                tick += every
            writer.write(stamp, values)
    return folder


EAST = Pose(30.0, 12.0, 1.5)
LABORATORY = Pose(12.0, 20.0, 0.0)
BAY = Pose(2.0, 2.0, 0.0)


def smooth_start() -> list[Moment]:
    """A leg that arrives without trouble, from 0 to 65 s."""
    return [
        (0.0, [Begin(0.0, 86_280.0), StepBegan(0, "go ward east", 3), LegBegan(1, 0, "ward east")]),
        (0.0, [Go(1, "ward east", EAST, 0.8)]),
        (65.0, [GoalNews(65.0, 1, Event.ARRIVED), LegEnded(1, 0, "ward east", Outcome.ARRIVED, "", 65.0, 41.2, 1, 0)]),
    ]


def stall_mended_by_replanning() -> list[Moment]:
    """A wait, then a leg with a stall that the second recovery ends, from 65 to 205 s."""
    return [
        (65.0, [StepBegan(1, "wait 20 s", 4)]),
        (85.0, [StepBegan(2, "go laboratory", 5), LegBegan(2, 2, "laboratory"), Go(2, "laboratory", LABORATORY, 0.8)]),
        (110.0, [IncidentBegan(1, 2, Event.STALLED, "0.05 m of progress in 12 s", Pose(24.26, 12.5, 3.1), 15.5)]),
        (110.0, [RecoveryBegan(1, 2, "clear 3 m", 1, 1, 1)]),
        (123.0, [RecoveryBegan(1, 2, "replan", 2, 2, 1), Replan(2)]),
        (
            151.0,
            [
                IncidentEnded(
                    1,
                    2,
                    True,
                    "replan",
                    41.0,
                    "route blocked",
                    (
                        "something the map does not know stood 0.6 m ahead on the route for the whole 41 s",
                        "the new route is 12.4 m longer",
                    ),
                )
            ],
        ),
        (205.0, [LegEnded(2, 2, "laboratory", Outcome.ARRIVED, "", 120.0, 55.0, 1, 2)]),
    ]


def leg_that_fails() -> list[Moment]:
    """A leg given up after its tries, with `otherwise` taken, from 205 to 330 s."""
    return [
        (205.0, [StepBegan(3, "go charging bay, within 2 min, otherwise a list of steps", 6)]),
        (205.0, [LegBegan(3, 3, "charging bay"), Go(3, "charging bay", BAY, 0.8)]),
        (220.0, [IncidentBegan(2, 3, Event.NO_ROUTE, "the door is shut", Pose(6.0, 2.0, 3.1), None)]),
        (220.0, [RecoveryBegan(2, 3, "replan", 1, 1, 1)]),
        (230.0, [TryFailed(3, 1, 20.0)]),
        (250.0, [RecoveryBegan(2, 3, "replan", 1, 2, 2)]),
        (
            330.0,
            [IncidentEnded(2, 3, False, "nothing: the leg failed", 110.0, "route blocked", ("no route in 2 tries",))],
        ),
        (330.0, [LegEnded(3, 3, "charging bay", Outcome.FAILED, "all 2 tries used", 125.0, 9.5, 2, 2)]),
    ]


def operators_at_work() -> list[Moment]:
    """The otherwise step, held and skipped by one person; the step after it aborted by another; to 420 s."""
    return [
        (330.0, [StepBegan(4, "go laboratory", 8), LegBegan(4, 4, "laboratory")]),
        (350.0, [Operator(350.0, Event.HOLD, "mara"), OperatorActed("hold", "mara", True), Halt()]),
        (355.0, [Operator(355.0, Event.HOLD, "mara"), OperatorActed("hold", "mara", False)]),
        (380.0, [OperatorActed("skip", "mara", True)]),
        (380.0, [LegEnded(4, 4, "laboratory", Outcome.SKIPPED, "skipped by a person", 50.0, 8.0, 1, 0)]),
        (380.0, [StepBegan(5, "go ward east", 9), LegBegan(5, 5, "ward east")]),
        (420.0, [OperatorActed("abort", "night desk", True), Halt()]),
        (420.0, [LegEnded(5, 5, "ward east", Outcome.ABORTED, "aborted by a person", 40.0, 21.0, 1, 0)]),
        (420.0, [Ended(Ending.ABORTED, "aborted by a person")]),
    ]


def hard_night() -> list[Moment]:
    """All of it: a stall, recoveries, a failed leg with otherwise, hold, skip, abort."""
    return [*smooth_start(), *stall_mended_by_replanning(), *leg_that_fails(), *operators_at_work()]
