"""The machine: states, transitions and registers as data. Nothing here runs; the engine interprets it.

A machine is a list of blocks. A block is one instance of a fragment (a small table of states, written once and shared
by every step of the same shape) together with what is particular to the step: where to go, how long, and which block
follows through which exit. So one `go` is a handful of explicit states, and ten thousand of them cost ten thousand
small tuples, not a million rows.

How a table is read:
- A state is (block, local): the block's number and the number of the state within its fragment.
- On entry a state's `on_entry` actions happen in order. Then, if it has AT ONCE rows, the first whose guard holds is
  taken without waiting. Otherwise the state rests until an event comes.
- An event takes the first row of that event whose guard holds; if the state has none, the machine's `anywhere` rows
  are looked at. `target` is a local state, an exit of the block, or None: stay, without entering again.
- `Exit.HELD` keeps the place in a return register and enters the held block; `Exit.RETURN` goes back to the
  `resume` state of the place that was left, `Exit.RETURN_SKIPPED` takes that place's own row for SKIP.
- A standing order keeps the place in a return register of its own; `Exit.ORDER_RETURN` goes back to `resume`,
  `Exit.ORDER_REPEAT` to `restart`.
- A state without rows is an end.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

from runner.language.expressions import Condition
from runner.language.mission import Mark, Order, Prove
from runner.site.values import Pose


class Event(Enum):
    """What can happen to a machine. The first is not an event but its absence: the row is taken without waiting."""

    AT_ONCE = "at once"
    ARRIVED = "arrived"
    REFUSED = "refused"
    NO_ROUTE = "no route"
    FAILED = "failed"
    HALTED = "halted"
    STALLED = "stalled"
    SWAYING = "swaying"
    PROGRESSED = "progressed"
    ACTION_DONE = "action done"
    ACTION_FAILED = "action failed"
    ACTION_OVERDUE = "action overdue"
    REST_OVER = "rest over"
    WAIT_OVER = "wait over"
    LEG_TIME_OVER = "leg time over"
    GIVE_UP_TIME = "give-up time"
    END_BY_TIME = "end-by time"
    UP_TO_OVER = "up-to time over"
    LAP_DUE = "lap due"
    CONDITION_MET = "condition met"
    ANSWERED = "answered"
    HOLD = "hold"
    RELEASE = "release"
    SKIP = "skip"
    ABORT = "abort"


class Timer(Enum):
    """A register that raises an event when its time has come."""

    ACTION = "action"
    REST = "rest"
    WAIT = "wait"
    LEG = "leg"
    GIVE_UP = "give up"
    UP_TO = "up to"
    LAP = "lap"


TIMER_EVENTS: dict[Timer, Event] = {
    Timer.ACTION: Event.ACTION_OVERDUE,
    Timer.REST: Event.REST_OVER,
    Timer.WAIT: Event.WAIT_OVER,
    Timer.LEG: Event.LEG_TIME_OVER,
    Timer.GIVE_UP: Event.GIVE_UP_TIME,
    Timer.UP_TO: Event.UP_TO_OVER,
    Timer.LAP: Event.LAP_DUE,
}

GOAL_ENDS = (Event.REFUSED, Event.NO_ROUTE, Event.FAILED, Event.HALTED)
"""The ways in which the robot itself ends a goal short of its pose."""


class Register(Enum):
    """Counters of the leg under way."""

    TRIES = "tries"
    RUNG = "rung"
    """Which recovery of the rule comes next, from 0."""
    RECOVERIES = "recoveries"
    """Recoveries begun in this leg, whatever the rung."""


class Exit(Enum):
    """The ways out of a block, and of the machine's regions."""

    NEXT = "next"
    FAILED = "failed"
    SKIPPED = "skipped"
    BODY = "body"
    BRANCH = "branch"
    HELD = "held"
    RETURN = "return"
    RETURN_SKIPPED = "return, skipped"
    ORDER_RETURN = "return from order"
    ORDER_REPEAT = "return from order, step anew"
    ABORTED = "aborted"
    TIMED_OUT = "timed out"


class Outcome(Enum):
    """How a leg ended."""

    ARRIVED = "arrived"
    FAILED = "failed"
    SKIPPED = "skipped"
    ABORTED = "aborted"
    INTERRUPTED = "interrupted"


class Ending(Enum):
    """How a mission ended."""

    COMPLETED = "completed"
    LEG_FAILED = "leg failed"
    GIVEN_UP = "given up"
    TIMED_OUT = "timed out"
    ABORTED = "aborted"


class Verb(Enum):
    """What an action does. In the comments: which fields of the action it uses."""

    DRIVE = "drive"  # send the block's goal unless it is under way; begin to watch progress
    HALT = "halt"
    CLEAR = "clear"  # amount: radius, m
    REPLAN = "replan"
    EASE_BACK = "ease back"  # amount: distance, m
    RELOCATE = "relocate"
    START = "start"  # timer; amount: seconds, None for the block's own `seconds` (no timer if that is None too)
    STOP = "stop"  # timer
    START_REST = "start rest"  # amounts in `rest`: first, factor, most; the exponent is the try
    SET = "set"  # register; amount: value
    ADD = "add"  # register; amount: increment
    BEGIN_LEG = "begin leg"
    END_LEG = "end leg"  # outcome; reason: a phrase
    SKIP_LEG = "skip leg"  # ends the leg under way as skipped, if there is one
    OPEN_INCIDENT = "open incident"  # once; trouble on trouble is the same incident
    CLOSE_INCIDENT = "close incident"  # reason: a phrase
    ENTER_LOOP = "enter loop"  # laps 0; deadline from the block
    COUNT_LAP = "count lap"
    START_LAP = "start lap"  # the timer to the next lap of a loop with an interval
    BEGIN_VISIT = "begin visit"  # all places of the block are still to be visited
    PICK_PLACE = "pick place"  # the next one, by the block's order
    ASK = "ask"  # the block's text and answers
    SILENCE = "silence"  # the answer is what the block says for silence
    CHARGE = "charge"
    COUNT = "count"  # the block's count, by its `by`
    NOTIFY = "notify"  # the block's text
    END_MISSION = "end mission"  # ending; reason: a phrase


class Test(Enum):
    """What a guard asks."""

    ALWAYS = "always"
    EQUALS = "equals"  # register == amount
    BELOW = "below"  # register < amount
    LAPS_LEFT = "laps left"  # laps of this loop < the block's `times`
    TIME_LEFT = "time left"  # the deadline of this loop has not come
    CONDITION = "condition"  # the block's condition holds at this moment
    PLACES_LEFT = "places left"  # the visit has a place picked


@dataclass(frozen=True, slots=True)
class Guard:
    test: Test
    register: Register | None = None
    amount: int = 0


ALWAYS = Guard(Test.ALWAYS)


@dataclass(frozen=True, slots=True)
class Action:
    verb: Verb
    amount: float | None = None
    timer: Timer | None = None
    register: Register | None = None
    outcome: Outcome | None = None
    ending: Ending | None = None
    rest: tuple[float, float, float] | None = None
    reason: str = ""


@dataclass(frozen=True, slots=True)
class Row:
    event: Event
    target: int | Exit | None
    actions: tuple[Action, ...] = ()
    guard: Guard = ALWAYS


@dataclass(frozen=True, slots=True)
class State:
    """`resume` is the local state in which the machine goes on when it was interrupted in this one.

    `restart` is where it begins anew when the step is to be repeated. `recovery` numbers the recoveries of a leg from
    1, in the order of the rule; 0 for every other state. In a state that `watches`, the block's condition is looked at
    with every input, from WATCH_AFTER_S on.
    """

    name: str
    rows: tuple[Row, ...] = ()
    on_entry: tuple[Action, ...] = ()
    resume: int = 0
    restart: int = 0
    recovery: int = 0
    watches: bool = False


@dataclass(frozen=True, slots=True)
class Watch:
    """When progress is too little: under `progress` meters of remaining route in `window` seconds."""

    progress: float
    window: float


@dataclass(frozen=True, slots=True)
class Fragment:
    """States written once; `watch` is set where they drive. The two bounds are those of a whole leg."""

    name: str
    states: tuple[State, ...]
    watch: Watch | None = None
    tries_at_most: int = 0
    recoveries_at_most: int = 0


WATCH_AFTER_S = 1.0
"""A condition is looked at from this long after its step began, so that waiting for what holds already takes time."""

Address = tuple[int, int]
"""Block number, local state."""


@dataclass(frozen=True, slots=True)
class Block:
    """An instance of a fragment. `step` indexes `Machine.steps`, None for the held block and the ends; `place`
    indexes `Machine.places`.

    `seconds`: a leg's time limit, a wait's length, how long a loop, a question or a condition may take. `times`: laps.
    `every`: seconds from one lap to the next, and whether a lap that overran waits for the next full interval.
    `branches`: where each place of a visit begins. `text`: what is asked, told or given as a reason; `word`: the name
    of a count, or the answer to silence.
    """

    fragment: str
    step: int | None
    exits: tuple[tuple[Exit, Address], ...] = ()
    place: int | None = None
    relative: bool = False
    seconds: float | None = None
    times: int | None = None
    condition: Condition | None = None
    every: float | None = None
    wait_for_interval: bool = False
    branches: tuple[Address, ...] = ()
    branch_places: tuple[int, ...] = ()
    order: Order = Order.LISTED
    text: str = ""
    answers: tuple[str, ...] = ()
    word: str = ""
    by: int = 0


@dataclass(frozen=True, slots=True)
class StepNote:
    """A step of the mission as people see it: what it says, how deep it is nested, where it is written.

    `loops` are the blocks of the loops around it, outermost first.
    """

    text: str
    depth: int
    mark: Mark
    loops: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Target:
    """A place a leg may drive to."""

    name: str
    pose: Pose


@dataclass(frozen=True, slots=True)
class OrderEntry:
    """A standing order: its steps begin at `entry`; they end in a return from the order or in an end."""

    name: str
    condition: Condition
    entry: Address


@dataclass(frozen=True, slots=True)
class Machine:
    """A compiled mission. `exits` are those that belong to no block: held, aborted, timed out."""

    name: str
    start: Address
    fragments: dict[str, Fragment]
    blocks: tuple[Block, ...]
    anywhere: tuple[Row, ...]
    exits: tuple[tuple[Exit, Address], ...]
    steps: tuple[StepNote, ...]
    places: tuple[Target, ...]
    speed: float
    """Cap on the speed of every leg, m/s."""
    end_by: float | None = None
    """Clock time by which the mission ends, seconds since midnight; the first such time after it began."""
    orders: tuple[OrderEntry, ...] = ()
    """Standing orders; where several could act at once the first one does."""
    prove: Prove | None = None
    home: int | None = None
    """The place at which the mission begins, if it is among `places`."""
    lengths: tuple[tuple[float, ...], ...] = ()
    """Route lengths between places, meters, row to column; only where a visit goes to the nearest place next."""
