"""What a mission says, once it has been read and checked: the syntax tree, as plain values.

The reader (`runner.language.reader`) makes these from text; the compiler (`runner.machine.compiler`) makes the
machine from them. Lengths in meters, durations in seconds, clock times in seconds since midnight.
Every step keeps its place in the text, so that later findings can show the line.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

from runner.language.expressions import Condition
from runner.site.values import Place, RobotDescription, Site


@dataclass(frozen=True, slots=True)
class Mark:
    """A stretch of source text: file, line and column counted from 1, and its width in characters."""

    file: str
    line: int
    column: int
    width: int = 1


class RecoveryKind(Enum):
    """One action of a retry rule, named by the word an author writes."""

    REPLAN = "replan"
    CLEAR = "clear"
    EASE_BACK = "ease back"
    REST = "rest"
    RELOCATE = "relocate"


@dataclass(frozen=True, slots=True)
class Recovery:
    """`amount` is the radius (clear), the distance (ease back) in meters or the duration (rest) in seconds."""

    kind: RecoveryKind
    amount: float = 0.0


@dataclass(frozen=True, slots=True)
class Rest:
    """The rest between tries: `first` seconds, multiplied by `factor` after each try, at most `most` seconds."""

    first: float
    factor: float = 1.0
    most: float = float("inf")


@dataclass(frozen=True, slots=True)
class RetryRule:
    """When a leg counts as stalled, what is tried, how often, and when to give up.

    A leg is stalled when its remaining route length fell by less than `stall_progress` meters in `stall_window`
    seconds. `give_up_after` bounds the whole leg in seconds, None for no bound of its own.
    """

    name: str
    tries: int
    rest: Rest
    stall_progress: float
    stall_window: float
    recover: tuple[Recovery, ...]
    give_up_after: float | None
    mark: Mark


class Otherwise(Enum):
    """What follows a leg that failed, in a word; the alternative is a list of steps."""

    SKIP = "skip"
    END = "end"


@dataclass(frozen=True, slots=True)
class Go:
    """Drive to a place, or, if `relative`, to a pose seen from where the robot stands (`ahead 3 m`).

    `otherwise` is None where the author wrote nothing.
    """

    mark: Mark
    place: Place
    rule: RetryRule
    within: float | None
    otherwise: Otherwise | tuple[Step, ...] | None
    relative: bool = False


class Order(Enum):
    """In which order places are visited."""

    LISTED = "listed"
    SHORTEST = "shortest"
    NEAREST = "nearest"
    SHUFFLED = "shuffled"


@dataclass(frozen=True, slots=True)
class Visit:
    """Drive to several places, each with the same rule; `otherwise` follows each failed leg.

    With `each`, every place has instead the steps of a routine, written out for it; `each` is as long as `places`.
    """

    mark: Mark
    places: tuple[tuple[Mark, Place], ...]
    rule: RetryRule
    within: float | None
    otherwise: Otherwise | tuple[Step, ...] | None
    order: Order = Order.LISTED
    each: tuple[tuple[Step, ...], ...] = ()


@dataclass(frozen=True, slots=True)
class Wait:
    """Stand still for some seconds, or until a condition holds.

    With a condition, `up_to` bounds the wait in seconds and `otherwise` follows if it was in vain; None for `skip`.
    """

    mark: Mark
    seconds: float | None
    until: Condition | None = None
    up_to: float | None = None
    otherwise: Otherwise | tuple[Step, ...] | None = None


@dataclass(frozen=True, slots=True)
class Ask:
    """Ask whoever is near or watches. After `up_to` seconds of silence the answer is `if_silent`, one of `answers`."""

    mark: Mark
    text: str
    answers: tuple[str, ...]
    up_to: float
    if_silent: str


@dataclass(frozen=True, slots=True)
class Charge:
    """Drive to a charger and charge until a condition holds, for `up_to` seconds at most.

    `otherwise` follows when the leg fails or the time is over; None where the author wrote nothing.
    """

    mark: Mark
    place: Place
    rule: RetryRule
    until: Condition
    up_to: float | None
    otherwise: Otherwise | tuple[Step, ...] | None


class Overrun(Enum):
    """What a lap does that lasted longer than `every`: the next begins at once, or at the next full interval."""

    AT_ONCE = "at once"
    NEXT_INTERVAL = "next interval"


@dataclass(frozen=True, slots=True)
class Repeat:
    """Do the steps again and again: `times` laps, for `seconds`, or until a condition holds.

    At most one of the three is set; none means for ever, which needs `every` or an `end by`. The bound is looked at
    before each lap (`times` and `seconds`: but the first), never inside one. With `every`, laps begin that many
    seconds apart.
    """

    mark: Mark
    times: int | None
    seconds: float | None
    until: Condition | None
    steps: tuple[Step, ...]
    every: float | None = None
    overrun: Overrun = Overrun.AT_ONCE


@dataclass(frozen=True, slots=True)
class When:
    """If the condition holds at this moment, the steps `then`, else the steps `otherwise` (may be empty)."""

    mark: Mark
    condition: Condition
    then: tuple[Step, ...]
    otherwise: tuple[Step, ...]


@dataclass(frozen=True, slots=True)
class Run:
    """A routine, its steps written out with its arguments; `title` is its name with them."""

    mark: Mark
    title: str
    steps: tuple[Step, ...]


@dataclass(frozen=True, slots=True)
class Count:
    """Add to a count of the mission."""

    mark: Mark
    name: str
    by: int


@dataclass(frozen=True, slots=True)
class Notify:
    """Tell a person, and go on."""

    mark: Mark
    text: str


@dataclass(frozen=True, slots=True)
class End:
    """End the mission here, as completed or as given up, with a reason in the author's words."""

    mark: Mark
    completed: bool
    because: str


Step = Go | Visit | Wait | Ask | Charge | Repeat | When | Run | Count | Notify | End


class Then(Enum):
    """What follows a standing order: the mission goes on where it was, begins its step anew, or ends."""

    CARRY_ON = "carry on"
    REPEAT_STEP = "repeat step"
    END = "end"


@dataclass(frozen=True, slots=True)
class StandingOrder:
    """Steps that interrupt the mission when a condition becomes true; again only after it was false in between."""

    mark: Mark
    name: str
    condition: Condition
    steps: tuple[Step, ...]
    then: Then


@dataclass(frozen=True, slots=True)
class Prove:
    """The claim to be proved: the share of legs that arrive, and the confidence; both fractions."""

    legs_arrive: float
    confidence: float


@dataclass(frozen=True, slots=True)
class Limits:
    """Bounds on the whole mission: speed in m/s, and the clock time by which it ends, done or not."""

    speed: float | None = None
    end_by: float | None = None


@dataclass(frozen=True, slots=True)
class Source:
    """One file the mission was read from, kept so that a record can hold it."""

    path: str
    text: str


@dataclass(frozen=True, slots=True)
class Mission:
    """A checked mission, with the site and the robot it is for."""

    name: str
    site: Site
    robot: RobotDescription
    start: Place
    start_mark: Mark
    limits: Limits
    rules: tuple[RetryRule, ...]
    steps: tuple[Step, ...]
    sources: tuple[Source, ...]
    prove: Prove | None = None
    orders: tuple[StandingOrder, ...] = ()
    silenced: tuple[str, ...] = ()
    """Names of findings the author has judged and does not want to see."""
    routines_unused: tuple[tuple[str, Mark], ...] = ()
    """Routines that no step runs, with the place of their names."""
