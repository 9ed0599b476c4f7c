"""The steps as generators: each runs until the mission takes time, and is told what happens then."""

from __future__ import annotations

from collections.abc import Callable, Generator
from math import ceil, hypot

from runner.engine.values import Answered, Asked, Counted, Effect, Notified, StartCharging, StepBegan
from runner.language.expressions import Condition
from runner.language.mission import (
    Ask,
    Charge,
    Count,
    End,
    Go,
    Mark,
    Mission,
    Notify,
    Order,
    Otherwise,
    Overrun,
    Repeat,
    Run,
    Step,
    Visit,
    Wait,
    When,
)
from runner.machine.table import Ending, Outcome, Timer
from runner.site.values import Place
from tests.engine.second_interpreter.asking import Loop, Watched, World
from tests.engine.second_interpreter.courses import Course, MissionEnds, SkipStep, StepAnew, Told, Walk, Word
from tests.engine.second_interpreter.driving import Drive, Driver

Around = tuple[Loop, ...]

ROUNDING = 1e-9
"""A lap that ends on a multiple of its interval, but for the last digits, ends on it."""


class Walker:
    """Walks steps. `scope` is the loop that `laps` means, None outside of one; `around` are all loops around."""

    def __init__(
        self,
        mission: Mission,
        world: World,
        effects: list[Effect],
        length: Callable[[Place, Place], float],
        shuffle: Callable[[int, int, int], list[int]],
    ) -> None:
        self.world, self.effects = world, effects
        self.driver = Driver(mission, world, effects)
        self.length, self.shuffle = length, shuffle
        self.began = 0.0
        self.seed = 0

    def walk(self, steps: tuple[Step, ...], course: Course, scope: Loop | None = None, around: Around = ()) -> Walk:
        for step in steps:
            yield from self._step(step, course, scope, around)

    def _step(self, step: Step, course: Course, scope: Loop | None, around: Around) -> Walk:
        match step:
            case Go():
                drive = Drive(step.mark, step.place, step.relative, step.rule, step.within)
                yield from self._go(drive, step.otherwise, course, scope, around)
            case Visit():
                yield from self._visit(step, course, scope, around)
            case Wait():
                yield from self._wait(step, course, scope, around)
            case Ask():
                yield from self._ask(step, course, around)
            case Charge():
                yield from self._charge(step, course, scope, around)
            case Repeat():
                yield from self._repeat(step, course, around)
            case When():
                holds = self.world.holds(step.condition.expression, self.began, scope)
                yield from self.walk(step.then if holds else step.otherwise, course, scope, around)
            case Run():
                # The reader lets nothing in a routine ask for laps of a loop outside, so the scope may stay.
                yield from self.walk(step.steps, course, scope, around)
            case Count():
                self.world.counts[step.name] = self.world.counts.get(step.name, 0) + step.by
                self.effects.append(Counted(step.name, self.world.counts[step.name]))
            case Notify():
                self.effects.append(Notified(step.text))
            case End():
                raise MissionEnds(Ending.COMPLETED if step.completed else Ending.GIVEN_UP, step.because)

    def _begins(self, mark: Mark, around: Around) -> None:
        self.effects.append(StepBegan(0, "", mark.line, tuple(loop.laps for loop in around)))

    # --- legs -----------------------------------------------------------------------------------------------------

    def _go(
        self,
        drive: Drive,
        otherwise: Otherwise | tuple[Step, ...] | None,
        course: Course,
        scope: Loop | None,
        around: Around,
    ) -> Walk:
        outcome = yield from self._leg(drive, course, around)
        if outcome is Outcome.FAILED:
            yield from self._in_vain(otherwise or Otherwise.END, course, scope, around)

    def _leg(self, drive: Drive, course: Course, around: Around) -> Generator[None, Told, Outcome]:
        while True:
            self._begins(drive.mark, around)
            try:
                return (yield from self.driver.leg(drive, course))
            except StepAnew:
                pass

    def _in_vain(
        self, otherwise: Otherwise | tuple[Step, ...], course: Course, scope: Loop | None, around: Around
    ) -> Walk:
        if otherwise is Otherwise.END:
            raise MissionEnds(Ending.LEG_FAILED)
        if isinstance(otherwise, tuple):
            yield from self.walk(otherwise, course, scope, around)

    def _visit(self, step: Visit, course: Course, scope: Loop | None, around: Around) -> Walk:
        left = list(range(len(step.places)))
        if step.order is Order.SHUFFLED:
            left = self.shuffle(self.seed, step.mark.line, len(left))
        while left:
            choice = min(left, key=lambda one: self._far(step, one)) if step.order is Order.NEAREST else left[0]
            left.remove(choice)
            mark, place = step.places[choice]
            if step.each:
                yield from self.walk(step.each[choice], course, scope, around)
            else:
                drive = Drive(mark, place, False, step.rule, step.within)
                yield from self._go(drive, step.otherwise, course, scope, around)

    def _far(self, step: Visit, choice: int) -> float:
        place = step.places[choice][1]
        if self.driver.at is not None:
            return self.length(self.driver.at, place)
        if self.driver.seen is None:
            return 0.0
        return hypot(self.driver.seen.pose.x - place.pose.x, self.driver.seen.pose.y - place.pose.y)

    # --- standing still -------------------------------------------------------------------------------------------

    def _wait(self, step: Wait, course: Course, scope: Loop | None, around: Around) -> Walk:
        for_time = step.until is None
        while True:
            self._begins(step.mark, around)
            timer, seconds = (Timer.WAIT, step.seconds) if for_time else (Timer.UP_TO, step.up_to)
            try:
                over = yield from self._until(step.until, timer, seconds, course, scope)
                break
            except StepAnew:
                pass
        if over is Timer.UP_TO:
            yield from self._in_vain(step.otherwise or Otherwise.SKIP, course, scope, around)

    def _until(
        self,
        until: Condition | None,
        timer: Timer,
        seconds: float | None,
        course: Course,
        scope: Loop | None,
        on: Callable[[], None] = lambda: None,
    ) -> Generator[None, Told, Timer | Word | None]:
        """Stand until the condition is met, the time is over or the step is skipped; what it was, None for skipped."""
        now = self.world.now
        course.watched = Watched(until, self.world.wall, scope, now + 1.0) if until else None
        try:
            with course.timed(timer, None if seconds is None else now + seconds):
                while True:
                    told = yield
                    if told is timer or told is Word.MET:
                        return Word.MET if told is Word.MET else timer
                    if told is Word.ON:
                        on()
        except SkipStep:
            return None
        finally:
            course.watched = None

    def _ask(self, step: Ask, course: Course, around: Around) -> Walk:
        while True:
            self._begins(step.mark, around)
            try:
                with course.timed(Timer.UP_TO, self.world.now + step.up_to):
                    yield from self._question(step, course)
                return
            except SkipStep:
                return
            except StepAnew:
                pass

    def _question(self, step: Ask, course: Course) -> Walk:
        course.question = step
        try:
            while True:
                self.world.answer = None
                left = course.timers[Timer.UP_TO] - self.world.now
                self.effects.append(Asked(step.text, step.answers, left, step.if_silent))
                while (told := (yield)) is not Word.ON:
                    if told is Timer.UP_TO:
                        self.world.answer = step.if_silent
                        self.effects.append(Answered(step.if_silent, ""))
                    if told in (Timer.UP_TO, Word.ANSWERED):
                        return
        finally:
            course.question = None

    def _charge(self, step: Charge, course: Course, scope: Loop | None, around: Around) -> Walk:
        drive = Drive(step.mark, step.place, False, step.rule, None)
        outcome = yield from self._leg(drive, course, around)
        if outcome is Outcome.SKIPPED:
            return
        over = None
        while outcome is Outcome.ARRIVED:
            self._begins(step.mark, around)
            self._plug_in()
            try:
                over = yield from self._until(step.until, Timer.UP_TO, step.up_to, course, scope, self._plug_in)
                self.driver.halt()
                break
            except StepAnew:
                pass
        if outcome is Outcome.FAILED or over is Timer.UP_TO:
            yield from self._in_vain(step.otherwise or Otherwise.END, course, scope, around)

    def _plug_in(self) -> None:
        self.effects.append(StartCharging())

    # --- loops ----------------------------------------------------------------------------------------------------

    def _repeat(self, step: Repeat, course: Course, around: Around) -> Walk:
        loop = Loop(self.world.now, self.world.wall)
        while self._goes_on(step, loop):
            if step.every is not None and loop.laps > 0:
                yield from self._pause(step, loop, course)
                if not self._goes_on(step, loop):
                    return
            loop.laps += 1
            loop.lap_began = self.world.now
            yield from self.walk(step.steps, course, loop, (*around, loop))

    def _goes_on(self, step: Repeat, loop: Loop) -> bool:
        if step.until is not None:
            return not self.world.holds(step.until.expression, loop.watch, loop)
        if loop.laps == 0:
            return True
        if step.times is not None:
            return loop.laps < step.times
        return step.seconds is None or self.world.now - loop.entered < step.seconds

    def _pause(self, step: Repeat, loop: Loop, course: Course) -> Walk:
        assert step.every is not None
        while True:
            intervals = 1
            if step.overrun is Overrun.NEXT_INTERVAL:
                intervals = max(1, ceil((self.world.now - loop.lap_began) / step.every - ROUNDING))
            due = max(self.world.now, loop.lap_began + intervals * step.every)
            try:
                with course.timed(Timer.LAP, due):
                    while (yield) is not Timer.LAP:
                        pass
                return
            except SkipStep:
                return
            except StepAnew:
                pass
