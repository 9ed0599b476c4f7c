"""The interpreter: inputs in, effects out, the steps walked by generators that stop where the mission takes time.

Texts for people (reasons, diagnoses, the words of a step) are left empty.
"""

from __future__ import annotations

from collections.abc import Callable
from contextlib import suppress
from math import inf

from runner.engine.values import (
    ActionNews,
    Answer,
    Answered,
    Begin,
    ClockMoved,
    ClockSet,
    Effect,
    Ended,
    GoalNews,
    Input,
    Operator,
    OperatorActed,
    OrderBegan,
    OrderEnded,
    Seen,
)
from runner.language.mission import Mission, Then
from runner.machine.table import Ending, Event, Timer
from runner.site.values import Place
from tests.engine.second_interpreter.asking import Watched, World, shows
from tests.engine.second_interpreter.courses import (
    Course,
    LegTimeOver,
    MissionEnds,
    SkipStep,
    StepAnew,
    Told,
    Word,
)
from tests.engine.second_interpreter.walking import Walker

Lengths = Callable[[Place, Place], float]
Shuffle = Callable[[int, int, int], list[int]]
"""From the seed, the line of the visit, and the number of places: their order."""

FIRST_OF_EQUALS = (Timer.ACTION, Timer.GIVE_UP, Timer.LAP, Timer.LEG, Timer.REST, Timer.UP_TO, Timer.WAIT)


class Interpreter:
    """One mission as it goes."""

    def __init__(self, mission: Mission, length: Lengths, shuffle: Shuffle) -> None:
        self.mission = mission
        self.world = World(mission.prove)
        self.effects: list[Effect] = []
        self.walker = Walker(mission, self.world, self.effects, length, shuffle)
        self.driver = self.walker.driver
        self.courses: list[Course] = []
        """The mission's own, and after it that of the standing order that acts."""
        self.held = False
        self.ended = False
        self.end_by: float | None = None
        self.orders: list[Watched] = []
        self.acted = [False for _ in mission.orders]

    # --- inputs ---------------------------------------------------------------------------------------------------

    def take(self, given: Input) -> list[Effect]:
        """What the robot and the record are told because of this input."""
        self.effects.clear()
        try:
            self._take(given)
        except MissionEnds as end:
            self._end(end)
        return list(self.effects)

    def _take(self, given: Input) -> None:
        if self.ended:
            return
        if isinstance(given, Begin):
            self._begin(given)
        else:
            self._let_time_pass(given.stamp)
            self._hear(given)
        self._look()

    def _begin(self, given: Begin) -> None:
        self.world.now, self.world.clock = given.stamp, given.clock
        self.walker.began, self.walker.seed = self.world.wall, given.seed
        if self.mission.limits.end_by is not None:
            self.end_by = shows(self.mission.limits.end_by, self.world.wall)
        self.orders = [Watched(order.condition, self.world.wall, None, given.stamp) for order in self.mission.orders]
        self._set_out(Course())

    def _let_time_pass(self, until: float) -> None:
        while (due := self._first_due()) is not None and due[0] <= until:
            self.world.now = max(self.world.now, due[0])
            if due[1] is None:
                raise MissionEnds(Ending.TIMED_OUT)
            del self.courses[-1].timers[due[1]]
            if due[1] in (Timer.LEG, Timer.GIVE_UP):
                self._throw(LegTimeOver())
            else:
                self._tell(due[1])
        self.world.now = max(self.world.now, until)

    def _first_due(self) -> tuple[float, Timer | None] | None:
        running = {} if self.held else self.courses[-1].timers
        due: list[tuple[float, Timer | None]] = [
            (running[timer], timer) for timer in FIRST_OF_EQUALS if timer in running
        ]
        if self.end_by is not None:
            due.insert(0, (self.end_by - self.world.clock, None))
        return min(due, key=lambda one: one[0], default=None)

    def _hear(self, given: Input) -> None:
        match given:
            case Seen():
                self.world.battery = given.battery
                self.driver.seen = given
                if not self.held:
                    self._tell(given)
            case GoalNews() if given.event is not None and given.goal_id == self.driver.goal:
                self.driver.goal = None
                self._tell(given)
            case ActionNews() if given.action_id == self.driver.action:
                self.driver.action = None
                self._tell(given)
            case Answer():
                self._answer(given)
            case Operator():
                self._act(given)
            case ClockMoved():
                self.world.clock += given.seconds
                self.effects.append(ClockSet(given.seconds))
            case _:
                pass

    def _answer(self, given: Answer) -> None:
        question = None if self.held else self.courses[-1].question
        answers = {answer.lower(): answer for answer in question.answers} if question else {}
        answer = answers.get(given.word.lower())
        if answer is None:
            self.effects.append(OperatorActed("answer", given.who, False))
            return
        self.world.answer = answer
        self.effects.append(Answered(answer, given.who))
        self._tell(Word.ANSWERED)

    def _act(self, given: Operator) -> None:
        accepted = self.held or given.event is not Event.RELEASE
        self.effects.append(OperatorActed(given.event.value, given.who, accepted))
        if not accepted or (self.held and given.event is Event.HOLD):
            return
        course = self.courses[-1]
        match given.event:
            case Event.ABORT:
                raise MissionEnds(Ending.ABORTED)
            case Event.HOLD:
                self.driver.halt()
                course.freeze(self.world.now)
                self.held = True
            case Event.RELEASE:
                self.held = False
                self._go_on(course)
            case _:
                self.driver.halt()
                if self.held:
                    course.thaw(self.world.now)
                self.held = False
                self._throw(SkipStep())

    # --- courses --------------------------------------------------------------------------------------------------

    def _set_out(self, course: Course) -> None:
        steps = course.order.steps if course.order else self.mission.steps
        self.courses.append(course)
        course.walk = self.walker.walk(steps, course)
        self._step(lambda: next(course.walk))

    def _tell(self, told: Told) -> None:
        course = self.courses[-1]
        self._step(lambda: course.walk.send(told))

    def _throw(self, error: Exception) -> None:
        course = self.courses[-1]
        self._step(lambda: course.walk.throw(error))

    def _step(self, move: Callable[[], None]) -> None:
        """Let the course under way go on until it stands again; if it is over, what follows."""
        try:
            move()
        except StopIteration:
            self._course_over(self.courses[-1])

    def _course_over(self, course: Course) -> None:
        if course.order is None or course.order.then is Then.END:
            raise MissionEnds(Ending.COMPLETED)
        self.courses.pop()
        self.effects.append(OrderEnded(course.order.name))
        if course.order.then is Then.REPEAT_STEP:
            self.courses[-1].thaw(self.world.now)
            self._throw(StepAnew())
        else:
            self._go_on(self.courses[-1])

    def _go_on(self, course: Course) -> None:
        course.thaw(self.world.now)
        if course.watched is not None:
            course.watched.start, course.watched.since = self.world.now + 1.0, None
        self._tell(Word.ON)

    def _end(self, end: MissionEnds) -> None:
        self.driver.halt()
        for course in reversed(self.courses):
            with suppress(MissionEnds):
                course.walk.throw(end)
        self.ended = True
        self.effects.append(Ended(end.ending, end.reason))

    # --- conditions -----------------------------------------------------------------------------------------------

    def _look(self) -> None:
        for _ in range(len(self.orders) + 1):
            if not self._order_acts() and not self._wait_is_over():
                return

    def _order_acts(self) -> bool:
        free = not self.held and len(self.courses) == 1
        first: int | None = None
        for number, watched in enumerate(self.orders):
            holds = watched.look(self.world)
            self.acted[number] = self.acted[number] and holds
            if holds and free and first is None and not self.acted[number]:
                first = number
        if first is None:
            return False
        self.acted[first] = True
        order = self.mission.orders[first]
        self.driver.halt()
        self.courses[-1].freeze(self.world.now)
        self.effects.append(OrderBegan(order.name, None))
        self._set_out(Course(order))
        return True

    def _wait_is_over(self) -> bool:
        watched = self.courses[-1].watched
        if self.held or watched is None or not watched.look(self.world):
            return False
        self._tell(Word.MET)
        return True

    # --- time -----------------------------------------------------------------------------------------------------

    def next_due(self) -> float:
        """When time alone may have an effect; infinity for never."""
        if self.ended:
            return inf
        due = self._first_due()
        looks = [watched.next_look(self.world) for watched in self.orders]
        watched = self.courses[-1].watched
        if watched is not None and not self.held:
            looks.append(watched.next_look(self.world))
        return min([due[0] if due else inf, *looks])
