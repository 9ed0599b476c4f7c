"""What goes into the engine and what comes out: inputs, commands, notes. Plain values, no behavior.

Inputs carry their stamp, seconds since the run began; it is all the engine ever knows of time.
Commands are for the robot. Notes are for the record: what a person wants to read in the morning.
"""

from __future__ import annotations

from dataclasses import dataclass

from runner.machine.table import Ending, Event, Outcome
from runner.site.values import Point, Pose

# --- inputs ---------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Begin:
    """The run begins. `clock` is the time of day at stamp 0, seconds since midnight; `seed` orders shuffled visits."""

    stamp: float
    clock: float
    seed: int = 0


@dataclass(frozen=True, slots=True)
class Seen:
    """Telemetry, as far as the engine uses it (units as in `backends.contract.Telemetry`)."""

    stamp: float
    pose: Pose
    spread: float
    speed: float
    battery: float
    driven: float
    remaining: float | None
    route_number: int
    route: tuple[Point, ...]
    obstacles: tuple[Point, ...]


@dataclass(frozen=True, slots=True)
class GoalNews:
    """The robot ended a goal, or (event None) accepted it or got under way."""

    stamp: float
    goal_id: int
    event: Event | None
    reason: str = ""


@dataclass(frozen=True, slots=True)
class ActionNews:
    """The robot ended an action."""

    stamp: float
    action_id: int
    done: bool
    reason: str = ""


@dataclass(frozen=True, slots=True)
class Tick:
    """Time has come this far; timers may have run out."""

    stamp: float


@dataclass(frozen=True, slots=True)
class Answer:
    """A person answers the question that is open."""

    stamp: float
    word: str
    who: str


@dataclass(frozen=True, slots=True)
class Operator:
    """A person acts: `event` is HOLD, RELEASE, SKIP or ABORT."""

    stamp: float
    event: Event
    who: str


@dataclass(frozen=True, slots=True)
class Remark:
    """A person leaves a remark in the record. It changes nothing."""

    stamp: float
    who: str
    text: str


@dataclass(frozen=True, slots=True)
class Trouble:
    """Something outside the mission went wrong (the record, the robot, the program): the mission is to be held.

    `kind` is a word or two that scripts may rely on, `detail` a sentence for people.
    """

    stamp: float
    kind: str
    detail: str


@dataclass(frozen=True, slots=True)
class ClockMoved:
    """The wall clock was set by so many seconds (network time, daylight saving, a computer that slept)."""

    stamp: float
    seconds: float


@dataclass(frozen=True, slots=True)
class PickedUp:
    """A run whose process had died goes on. Its stamps go on without a gap; `clock` is the time of day at stamp 0
    that makes the clock right again, seconds since midnight."""

    stamp: float
    who: str
    clock: float
    down: float
    """Wall seconds for which nobody was in charge; 0 where time is virtual."""


Input = Begin | Seen | GoalNews | ActionNews | Tick | Answer | Operator | Remark | Trouble | ClockMoved | PickedUp

# --- commands -------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Go:
    goal_id: int
    place: str
    pose: Pose
    speed: float
    relative: bool = False


@dataclass(frozen=True, slots=True)
class Halt:
    pass


@dataclass(frozen=True, slots=True)
class Clear:
    action_id: int
    radius: float


@dataclass(frozen=True, slots=True)
class Replan:
    action_id: int


@dataclass(frozen=True, slots=True)
class EaseBack:
    action_id: int
    distance: float


@dataclass(frozen=True, slots=True)
class Relocate:
    action_id: int


@dataclass(frozen=True, slots=True)
class StartCharging:
    pass


Command = Go | Halt | Clear | Replan | EaseBack | Relocate | StartCharging

# --- notes ----------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class StepBegan:
    """`laps` are the laps of the loops around the step, outermost first, counted from 1."""

    step: int
    text: str
    line: int
    laps: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class LegBegan:
    leg: int
    step: int
    place: str


@dataclass(frozen=True, slots=True)
class LegEnded:
    """`seconds` and `meters` from where the leg began; `reason` says why, where it did not arrive."""

    leg: int
    step: int
    place: str
    outcome: Outcome
    reason: str
    seconds: float
    meters: float
    tries: int
    recoveries: int


@dataclass(frozen=True, slots=True)
class IncidentBegan:
    """`sign` is the event that showed the trouble."""

    incident: int
    leg: int
    sign: Event
    detail: str
    pose: Pose | None
    remaining: float | None


@dataclass(frozen=True, slots=True)
class RecoveryBegan:
    """One recovery is tried. `rung` counts from 1 within the rule, `attempt` from 1 within the incident."""

    incident: int
    leg: int
    recovery: str
    rung: int
    attempt: int
    tries: int


@dataclass(frozen=True, slots=True)
class IncidentEnded:
    """`ended_by` is the recovery after which the robot got on, or what else ended the trouble.

    `diagnosis` is what the evidence speaks for, `reasons` the evidence.
    """

    incident: int
    leg: int
    recovered: bool
    ended_by: str
    seconds: float
    diagnosis: str
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class TryFailed:
    """A try of a leg is over without arriving; `rest` seconds until the next one."""

    leg: int
    tries: int
    rest: float


@dataclass(frozen=True, slots=True)
class OperatorActed:
    """An intervention. `accepted` is False where the action meant nothing in this state."""

    action: str
    who: str
    accepted: bool


@dataclass(frozen=True, slots=True)
class Asked:
    """A question is open; after `seconds` the answer will be `if_silent`."""

    text: str
    answers: tuple[str, ...]
    seconds: float
    if_silent: str


@dataclass(frozen=True, slots=True)
class Answered:
    """`who` is empty where nobody answered in time."""

    answer: str
    who: str


@dataclass(frozen=True, slots=True)
class Notified:
    """Something a person is to be told, in the author's words."""

    text: str


@dataclass(frozen=True, slots=True)
class Counted:
    name: str
    value: int


@dataclass(frozen=True, slots=True)
class OrderBegan:
    """A standing order interrupts the mission at a step."""

    name: str
    step: int | None


@dataclass(frozen=True, slots=True)
class OrderEnded:
    """A standing order is over and the mission goes on."""

    name: str


@dataclass(frozen=True, slots=True)
class Ended:
    ending: Ending
    reason: str


@dataclass(frozen=True, slots=True)
class Remarked:
    """What a person wants to be read in the morning."""

    who: str
    text: str


@dataclass(frozen=True, slots=True)
class TroubleNoted:
    """Trouble outside the mission. `held` says whether the mission was held for it; it may have been held already."""

    kind: str
    detail: str
    held: bool


@dataclass(frozen=True, slots=True)
class ClockSet:
    """Clock conditions moved by so many seconds; durations did not."""

    seconds: float


@dataclass(frozen=True, slots=True)
class Resumed:
    """The run was picked up after its process had died, `down` seconds before."""

    who: str
    down: float


Note = (
    StepBegan
    | LegBegan
    | LegEnded
    | IncidentBegan
    | RecoveryBegan
    | IncidentEnded
    | TryFailed
    | OperatorActed
    | Asked
    | Answered
    | Notified
    | Counted
    | OrderBegan
    | OrderEnded
    | Remarked
    | TroubleNoted
    | ClockSet
    | Resumed
    | Ended
)

Effect = Command | Note
