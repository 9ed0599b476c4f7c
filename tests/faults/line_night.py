"""One session over a bad line, made from a seed: goals, actions, halts, cuts, restarts of both sides, and a rival.

The auditor reads the frames on the wire with the standard library alone, and knows the robot's own account of where it
drove. The bad part of a session is followed by a calm one, in which everything that was begun must come to its end.
"""

from __future__ import annotations

import json
import zlib
from collections.abc import Callable
from dataclasses import dataclass, field
from itertools import pairwise
from random import Random

from backends.contract import BackendError, GoalReport, GoalStatus
from backends.link.controller import FORGOTTEN
from backends.link.messages import Clear, Replan
from tests.backends.link.rig import Badness, Rig, goal

BAD_S, CALM_S = 40.0, 45.0
BOUND_S = 1.0 + 0.1 + 0.1
"""From a halt to standing: the robot's silence, its braking, and a few turns of the two programs."""
ENDS = ("arrived", "refused", "no route", "halted", "failed")


@dataclass
class Auditor:
    """Watches the robot's end of the wire: what it serves, and for which token."""

    newest_token: str = ""
    served: int = 0
    wrong: list[str] = field(default_factory=list)

    def watch(self, rig: Rig) -> None:
        """Stand between the line and the robot's side that is there now."""
        receive = rig.side.receive

        def receiving(peer: bytes, person: str, frame: bytes) -> list[tuple[bytes, bytes]]:
            asked, answers = read(frame), receive(peer, person, frame)
            for _, answer in answers:
                self._answer(asked, read(answer) or {})
            return answers

        rig.side.receive = receiving  # type: ignore[method-assign]
        self.newest_token = ""
        self._nonces.clear()

    def _answer(self, asked: dict[str, object] | None, answer: dict[str, object]) -> None:
        if answer.get("kind") == "granted":
            known = answer["lease"] == self.newest_token
            if not known and asked is not None and asked.get("nonce") not in self._nonces:
                self.newest_token = str(answer["lease"])
                self._nonces.add(asked.get("nonce"))
        if answer.get("kind") == "done" and answer.get("outcome") in ("taken", "known", "old", "not able"):
            self.served += 1
            if asked is None or asked.get("lease") != self.newest_token:
                self.wrong.append(f"{asked} was served while the lease was {self.newest_token}")
            if asked is not None and asked["kind"] == "leave":
                self.newest_token = ""

    _nonces: set[object] = field(default_factory=set)


def read(frame: bytes) -> dict[str, object] | None:
    """A frame with the standard library alone; None for what is none."""
    if len(frame) < 6 or zlib.crc32(frame[4:]) != int.from_bytes(frame[:4], "big"):
        return None
    try:
        found = json.loads(frame[4:])
    except ValueError:
        return None
    return found if isinstance(found, dict) else None


class Night:
    """One session. `run` raises AssertionError, with the seed, where a promise is broken."""

    def __init__(self, seed: int) -> None:
        self.seed = seed
        self.random = random = Random(seed)  # noqa: S311  a test's chance, not a secret
        self.rig = Rig(badness(random), seed)
        self.auditor = Auditor()
        self.auditor.watch(self.rig)
        self.given: list[int] = []
        self.halted_at: float | None = None
        self.last_action = 0
        self.actions: list[int] = []
        """Those that must be answered: all but those under way when the controller's program was restarted."""
        self.robot_restarts = 0
        self.forgetful = random.random() < 0.2
        """Whether the robot forgets its goals when its program is started again. Then only one side is restarted: who
        has lost both accounts cannot know what was driven."""
        self.arrived_at: dict[float, float] = {}
        self.seen_drives: list[object] = []
        self.programs: list[int] = []
        """How many reports there were each time that the controller's program was restarted."""
        self.unasked: int | None = None
        """A goal that was halted before the restart, which nobody asks after any more."""
        self.lost = False
        self.rival_goals = 0

    def run(self) -> None:
        rig = self.rig
        rig.controller()
        plans = sorted((self.random.uniform(1.0, BAD_S), self._deed()) for _ in range(self.random.randint(4, 14)))
        for at, deed in plans:
            self._until(at)
            deed()
        self._until(BAD_S)
        rig.to_robot.badness = rig.to_controllers.badness = Badness()
        self._until(BAD_S + CALM_S)
        self._check()

    def _deed(self) -> Callable[[], None]:
        deeds = [self._go] * 5 + [self._halt] * 2 + [self._act] * 2
        deeds += [self._restart_robot, self._restart_robot if self.forgetful else self._restart_controller, self._rival]
        return _Deed(self.random.choice(deeds))

    # --- what is done

    def _go(self) -> None:
        number = len(self.given) + 1
        self.given.append(number)
        self.halted_at = None
        self.rig.controllers[b"a"].go(goal(number, x=target(number), speed=0.5))

    def _halt(self) -> None:
        self.halted_at = self.rig.now
        self.rig.controllers[b"a"].halt()

    def _act(self) -> None:
        self.last_action += 1
        number = self.last_action
        self.actions.append(number)
        if number % 2:
            self.rig.controllers[b"a"].act(number, lambda lease, n, heard: Clear(lease, n, heard, number, 1.0))
        else:
            self.rig.controllers[b"a"].act(number, lambda lease, n, heard: Replan(lease, n, heard, number))

    def _restart_robot(self) -> None:
        self.robot_restarts += 1
        self.rig.restart_robot(None if self.forgetful else self.rig.side._duty.ledger.kept())
        self.auditor.watch(self.rig)

    def _restart_controller(self) -> None:
        """The host's program dies and is started again; it sends the goal that it had not seen the end of again."""
        ended = {report.goal_id for report in self.rig.goal_ends()}
        answered = {answer.action_id for answer in self.rig.answers()}
        self.actions = [number for number in self.actions if number in answered]
        self.rig.controllers.pop(b"a")
        self.programs.append(len(self.rig.reports[b"a"]))
        self._until(self.rig.now + self.random.uniform(0.1, 4.0))
        controller = self.rig.controller()
        if self.halted_at is not None:
            self.unasked = self.given[-1] if self.given else None
            controller.halt()
        elif self.given and self.given[-1] not in ended:
            controller.go(goal(self.given[-1], x=target(self.given[-1]), speed=0.5))

    def _rival(self) -> None:
        """Somebody else wants the robot for a while."""
        if b"b" not in self.rig.controllers:
            self.rig.controller(f"rival-session-{self.rig.now:.2f}", b"b")

    # --- time

    def _until(self, at: float) -> None:
        while self.rig.now < at and not self.lost:
            try:
                self.rig.step()
            except BackendError:
                self._give_up()
            self._look()

    def _give_up(self) -> None:
        """Somebody else has the robot. For the rival that is all; for the run it is the end of the session."""
        if b"b" in self.rig.controllers and not self.rig.controllers[b"b"].ready:
            del self.rig.controllers[b"b"]
        else:
            self.lost = True

    def _look(self) -> None:
        rig = self.rig
        rival = rig.controllers.get(b"b")
        if rival is not None and rival.ready and self.random.random() < 0.02:
            self.rival_goals += 1
            rival.go(goal(self.rival_goals, x=-1.0 - self.rival_goals, speed=0.5))
            if self.random.random() < 0.3:
                rival.leave()
        if rival is not None and rival._leaving and rival.settled:
            del rig.controllers[b"b"]
        for drive in rig.point.drives[len(self.seen_drives) :]:
            self.seen_drives.append(drive)
            x = drive.pose.x
            if rig.point.pose.x == x:
                continue  # it stands there: its program was restarted between the arrival and the note of it
            assert x not in self.arrived_at, f"seed {self.seed}: the goal at {x} was driven again after it was reached"
        if not rig.point._drive and rig.point.pose.x in self._targets():
            self.arrived_at.setdefault(rig.point.pose.x, rig.now)
        if self.halted_at is not None and rig.now > self.halted_at + BOUND_S and self._ours():
            raise AssertionError(
                f"seed {self.seed}: the robot still drives {rig.now - self.halted_at:.2f} s after a halt"
            )

    def _ours(self) -> bool:
        """Whether the robot drives to a goal of ours."""
        drive = self.rig.point._drive
        return drive is not None and drive.pose.x > 0.0

    def _targets(self) -> set[float]:
        return {target(number) for number in self.given}

    # --- the account

    def _check(self) -> None:
        where = f"seed {self.seed}"
        assert not self.auditor.wrong, f"{where}: {self.auditor.wrong[0]}"
        ends: dict[int, list[GoalReport]] = {}
        for report in self.rig.goal_ends():
            ends.setdefault(report.goal_id, []).append(report)
        for number, reports in ends.items():
            assert len(reports) == 1, f"{where}: goal {number} ended {len(reports)} times"
            reached = target(number) in self.arrived_at
            if reports[0].status is GoalStatus.ARRIVED:
                assert reached, f"{where}: goal {number} is said to have arrived, but the robot was never there"
            elif reports[0].reason == FORGOTTEN:
                assert self.robot_restarts, f"{where}: goal {number} was forgotten by a robot that was not restarted"
            elif reports[0].status is not GoalStatus.HALTED:
                raise AssertionError(f"{where}: goal {number} ended {reports[0].status.value}: {reports[0].reason}")
        answered = [answer.action_id for answer in self.rig.answers()]
        assert len(answered) == len(set(answered)), f"{where}: an action was answered twice"
        stamps = [report.stamp for report in self.rig.reports[b"a"]]
        for start, end in pairwise([0, *self.programs, len(stamps)]):
            assert stamps[start:end] == sorted(stamps[start:end]), f"{where}: stamps fall"
        if self.lost:
            return
        assert set(self.actions) <= set(answered), f"{where}: an action was never answered"
        if self.given and self.given[-1] != self.unasked:
            assert self.given[-1] in ends, f"{where}: the last goal never ended"
            ledger = self.rig.side._duty.ledger.open("session-one").goal
            told = ends[self.given[-1]][0].status.value
            if ledger is not None and ledger.id == self.given[-1]:
                assert ledger.status == told, f"{where}: the robot says {ledger.status}, the run's record {told}"
            elif not self.forgetful:
                assert told in ("halted", "failed"), f"{where}: a goal that the robot never had ended {told}"


class _Deed:
    """A deed that can be sorted beside others of the same time."""

    def __init__(self, do: Callable[[], None]) -> None:
        self._do = do

    def __call__(self) -> None:
        self._do()

    def __lt__(self, other: object) -> bool:
        return False


def target(number: int) -> float:
    """Where a goal leads: each to a place of its own, so that places tell goals apart."""
    return 3.0 * (number % 2) + 0.01 * number + 1.0


def badness(random: Random) -> Badness:
    """A line that is bad in its own way."""
    cuts = []
    at = random.uniform(2.0, 10.0)
    for _ in range(random.randint(0, 4)):
        end = at + random.choice((0.3, 1.0, 3.0, 6.0, 12.0)) * random.uniform(0.5, 1.5)
        cuts.append((at, end))
        at = end + random.uniform(0.5, 12.0)
    return Badness(
        delay=random.choice((0.001, 0.02, 0.1, 0.25)),
        delay_spread=random.choice((0.0, 0.02, 0.2, 0.5)),
        drop=random.choice((0.0, 0.02, 0.1, 0.3)),
        repeat=random.choice((0.0, 0.05, 0.3)),
        corrupt=random.choice((0.0, 0.02, 0.1)),
        cuts=tuple(cuts),
        held=random.random() < 0.5,
    )
