"""A run written down beforehand, so that screens can be looked at and tested without a robot.

As a program, `python -m tests.screen.scripted [SCENE]` shows it in this terminal, playing on from that scene.
"""

from __future__ import annotations

import math
import sys
from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import pairwise

from runner.host.messages import Deed, Done
from runner.host.view import FeedLine, Health, View, Weight
from runner.language.mission import Mark
from runner.machine.table import StepNote
from runner.screen.showing import Showing
from runner.site.values import Battery, Door, Lidar, Place, Point, Pose, RobotDescription, Site, Solid, Wall

_NORTH = {"ward west": 4.5, "ward east": 13.5, "laboratory": 22.5, "pharmacy": 31.5, "imaging": 40.5}
_SOUTH = {"store room": 4.5, "kitchen": 14.5, "records": 23.5, "reception": 31.5, "staff room": 40.5}


def clinic() -> Site:
    """Ten rooms along a corridor, with a bay and a lift at its ends."""
    lines = [((0.0, 0.0), (45.0, 0.0), (45.0, 25.0), (0.0, 25.0), (0.0, 0.0)), ((0.0, 11.0), (45.0, 11.0))]
    lines += [((0.0, 14.0), (45.0, 14.0))]
    lines += [((x, 14.0), (x, 25.0)) for x in (9.0, 18.0, 27.0, 36.0)]
    lines += [((x, 0.0), (x, 11.0)) for x in (10.0, 20.0, 28.0, 36.0)]
    night = {"imaging": ((20 * 3600.0, 6 * 3600.0),)}
    doors = [Door(f"{name} door", (x, 14.0), (x + 1.2, 14.0), 0.15, night.get(name, ())) for name, x in _NORTH.items()]
    doors += [Door(f"{name} door", (x, 11.0), (x + 1.2, 11.0), 0.15) for name, x in _SOUTH.items()]
    places = [Place("charging bay", Pose(1.5, 12.5, 0.0)), Place("lift", Pose(43.5, 12.5, math.pi))]
    places += [Place(name, Pose(x, 20.0, math.pi / 2)) for name, x in _NORTH.items()]
    places += [Place(name, Pose(x, 5.0, -math.pi / 2)) for name, x in _SOUTH.items()]
    return Site(
        name="Harbour clinic",
        width=45.0,
        height=25.0,
        walls=tuple(Wall(points, 0.15) for points in lines),
        solids=(Solid(((12.0, 18.0), (15.0, 18.0), (15.0, 19.0), (12.0, 19.0))),),
        doors=tuple(doors),
        places=tuple(places),
    )


def cart() -> RobotDescription:
    """A cart of 60 by 44 cm."""
    return RobotDescription(
        name="Small cart",
        footprint=((0.3, 0.22), (-0.3, 0.22), (-0.3, -0.22), (0.3, -0.22)),
        speed=0.8,
        reverse_speed=0.2,
        acceleration=0.6,
        turn_speed=1.4,
        turn_acceleration=2.8,
        lidar=Lidar(math.radians(270), 180, 12.0, 8.0, 0.015),
        battery=Battery(240.0, 22.0, 85.0, 300.0),
    )


def _note(text: str, depth: int, line: int) -> StepNote:
    return StepNote(text, depth, Mark("evening-round.yaml", line, 3))


STEPS = (
    _note("repeat until 05:30", 0, 24),
    _note("visit 4 places", 1, 26),
    _note("go to ward west", 2, 27),
    _note("go to ward east", 2, 27),
    _note("go to laboratory", 2, 27),
    _note("go to imaging", 2, 27),
    _note("go to pharmacy", 1, 31),
    _note("go to reception, if that failed", 2, 34),
    _note("wait 2:00", 1, 36),
    _note("go to charging bay", 0, 38),
)


def showing(steps: tuple[StepNote, ...] = STEPS) -> Showing:
    """The evening round."""
    return Showing(
        "Evening specimen round",
        "evening-0312",
        clinic(),
        cart(),
        steps,
        "trundle report evening-0312",
        "trundle pick-up evening-0312",
        troubles=((5.5, 12.6), (31.8, 13.6)),
    )


WAY: tuple[Point, ...] = (
    (5.1, 20.0), (5.1, 15.0), (5.1, 13.2),
    (7.0, 12.5), (20.0, 12.5), (22.6, 12.8), (23.1, 14.0), (23.1, 15.5), (22.5, 20.0)
)  # fmt: skip
"""From ward west to the laboratory."""


def _along(way: Sequence[Point], step: float) -> Iterator[tuple[Pose, tuple[Point, ...], float]]:
    """Pose, way still to drive and its length, at every `step` meters."""
    for number, ((x1, y1), (x2, y2)) in enumerate(pairwise(way)):
        length = math.dist((x1, y1), (x2, y2))
        for part in range(int(length / step)):
            at = (x1 + (x2 - x1) * part * step / length, y1 + (y2 - y1) * part * step / length)
            ahead = (at, *way[number + 1 :])
            remaining = sum(math.dist(a, b) for a, b in pairwise(ahead))
            yield Pose(*at, math.atan2(y2 - y1, x2 - x1)), ahead, remaining


def _clock(stamp: float) -> str:
    whole = int(stamp) + 3 * 3600
    return f"{whole // 3600 % 24:02}:{whole // 60 % 60:02}:{whole % 60:02}"


def driving() -> list[View]:
    """Every view of the leg from ward west to the laboratory, four a second at 0.8 m/s."""
    return [
        View(
            stamp=720.0 + number / 4,
            clock=_clock(720.0 + number / 4),
            health=Health.MOVING,
            reason="driving to laboratory",
            step=4,
            laps=(2,),
            laps_at_most=(8,),
            to_visit=("imaging",),
            repeats_until=8_200.0,
            ends_by=9_720.0,
            place="laboratory",
            leg_seconds=number / 4,
            leg_limit=240.0,
            tries=1,
            tries_at_most=3,
            recoveries_at_most=15,
            pose=pose,
            spread=0.04,
            speed=0.8,
            battery=0.83,
            remaining=remaining,
            route=ahead,
            obstacles=((pose.x + 2.0, 11.4), (pose.x + 2.1, 11.5), (pose.x + 2.9, 13.1)),
            legs_arrived=9,
            incidents=1,
        )
        for number, (pose, ahead, remaining) in enumerate(_along(WAY, 0.2))
    ]


MOVING = driving()[90]
RECOVERING = replace(
    MOVING,
    health=Health.RECOVERING,
    reason="clearing 3 m around itself, after under 0.3 m of progress in 12 s",
    recoveries=2,
    speed=0.0,
    incidents=2,
    obstacles=tuple((MOVING.pose.x + 0.8, 11.6 + 0.2 * number) for number in range(10)) if MOVING.pose else (),
)
HELD = replace(MOVING, health=Health.HELD, reason="a person holds the robot", speed=0.0)
WAITING = replace(MOVING, health=Health.WAITING, reason="waiting, 1:42 left", step=8, place=None, remaining=None,
                  route=(), leg_seconds=None, leg_limit=None, tries=0, tries_at_most=0, speed=0.0,
                  to_visit=())  # fmt: skip
NEEDS_YOU = replace(WAITING, health=Health.NEEDS_YOU, reason="question: Tray taken at laboratory?, 1:12 left", step=4,
                    question="Tray taken at laboratory?", answers=("yes", "no", "come again"),
                    pose=Pose(22.5, 19.4, math.pi / 2), obstacles=())  # fmt: skip
TROUBLE = replace(HELD, health=Health.NEEDS_YOU, reason="Nothing has been heard from the robot for 31 s.", spread=0.9)
ENDED = replace(WAITING, health=Health.ENDED, reason="all steps done", step=None, laps=(), outcome="completed",
                legs_arrived=12, legs_failed=1, incidents=2, stamp=2531.0)  # fmt: skip
SCENES = {"moving": MOVING, "recovering": RECOVERING, "held": HELD, "waiting": WAITING, "needs-you": NEEDS_YOU,
          "trouble": TROUBLE, "lost": MOVING, "ended": ENDED}  # fmt: skip
AGES = {"lost": 47.0}
"""For how many seconds nothing has been heard, in scenes where that is so."""

FEED = (
    FeedLine(640.0, "03:10:40", Weight.PLAIN, "Began lap 2 of repeat until 05:30."),
    FeedLine(655.0, "03:10:55", Weight.PLAIN, "Driving to ward west, 4:00 at most."),
    FeedLine(
        690.0, "03:11:30", Weight.TROUBLE, "Stalled on the way to ward west: 0.1 m of progress in 12 s.", (12.4, 12.3)
    ),
    FeedLine(691.0, "03:11:31", Weight.NOTICE, "Recovery 1 of this leg: replan."),
    FeedLine(699.0, "03:11:39", Weight.PLAIN, "Got on after replan: the route was blocked."),
    FeedLine(718.0, "03:11:58", Weight.PLAIN, "Arrived at ward west after 1:03, 21 m."),
    FeedLine(720.0, "03:12:00", Weight.PLAIN, "Driving to laboratory, 4:00 at most."),
)


HOLD_LINE = FeedLine(741.0, "03:12:21", Weight.NOTICE, "held by kim (pts/2, 10.0.0.7)", who="kim (pts/2, 10.0.0.7)")
LINES = {"held": (*FEED, HOLD_LINE)}


class Replay:
    """A source that shows views one after another, the last one for good. What is asked of it is never answered."""

    def __init__(self, views: Sequence[View], lines: Sequence[FeedLine] = FEED, age: float = 0.0) -> None:
        self.views = list(views)
        self.lines = list(lines)
        self.silent = age
        self.done: list[tuple[Deed, str]] = []

    def view(self) -> View | None:
        if not self.views:
            return None
        return self.views.pop(0) if len(self.views) > 1 else self.views[0]

    def age(self) -> float:
        return self.silent

    def feed(self) -> Sequence[FeedLine]:
        new, self.lines = self.lines, []
        return new

    def do(self, deed: Deed, text: str = "") -> str:
        self.done.append((deed, text))
        return str(len(self.done))

    def answers(self) -> Sequence[Done]:
        return ()


def scene(name: str) -> Replay:
    """A source that shows one scene."""
    return Replay([SCENES[name]], LINES.get(name, FEED), AGES.get(name, 0.0))


def main() -> None:
    from runner.screen.watch import watch

    name = sys.argv[1] if len(sys.argv) > 1 else "driving"
    watch(showing(), Replay(driving()) if name == "driving" else scene(name), "--read-only" in sys.argv)


if __name__ == "__main__":
    main()
