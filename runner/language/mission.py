"""What a mission says, once it has been read and checked: the syntax tree, as plain values.

The reader (`runner.language.reader`) makes these from text; the compiler (`runner.machine.compiler`) makes the
machine from them. Lengths in meters, durations in seconds, clock times in seconds since midnight.
Every step keeps its place in the text, so that later findings can show the line.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

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
    """Drive to a place. `otherwise` is None where the author wrote nothing."""

    mark: Mark
    place: Place
    rule: RetryRule
    within: float | None
    otherwise: Otherwise | tuple[Step, ...] | None


@dataclass(frozen=True, slots=True)
class Visit:
    """Drive to several places in the order listed, each with the same rule; `otherwise` follows each failed leg."""

    mark: Mark
    places: tuple[tuple[Mark, Place], ...]
    rule: RetryRule
    within: float | None
    otherwise: Otherwise | tuple[Step, ...] | None


@dataclass(frozen=True, slots=True)
class Wait:
    """Stand still for some seconds."""

    mark: Mark
    seconds: float


@dataclass(frozen=True, slots=True)
class Repeat:
    """Do the steps again and again: `times` laps, or until `seconds` have passed or the clock shows `until_clock`.

    Exactly one of the three is set. The bound is looked at before each lap but the first, never inside one.
    `until_clock` means the first time the clock shows that time after the loop was entered.
    """

    mark: Mark
    times: int | None
    seconds: float | None
    until_clock: float | None
    steps: tuple[Step, ...]


Step = Go | Visit | Wait | Repeat


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
