"""The requirements of PROTOCOL.md, by number. PROTOCOL.md lists them in the same words, and a test compares the two."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from backends.link.trial import moving, standing
from backends.link.trial.attempt import Attempt


@dataclass(frozen=True, slots=True)
class Requirement:
    """One requirement. `moves` says that trying it moves the robot."""

    number: int
    text: str
    attempt: Callable[[Attempt], None]
    moves: bool = False

    @property
    def name(self) -> str:
        return f"R{self.number}{'*' if self.moves else ''}"


REQUIREMENTS: tuple[Requirement, ...] = (
    Requirement(1, "`hello` is answered with `about` within a second, in this version.", standing.greets),
    Requirement(2, "`take` with another version gets the fault `version`.", standing.refuses_version),
    Requirement(
        3, "Frames with a wrong length, checksum or text get the fault `not readable`.", standing.refuses_unreadable
    ),
    Requirement(4, "Messages with wrong members get the fault `not valid`.", standing.refuses_invalid),
    Requirement(5, "A kind that is not known gets the fault `unknown message`.", standing.refuses_unknown),
    Requirement(6, "The lease is granted where nobody holds it, to a session without a goal.", standing.grants),
    Requirement(7, "The same request for the lease gets the same token.", standing.repeats_grant),
    Requirement(
        8, "A second controller gets the fault `taken`, and the first keeps the lease.", standing.one_controller
    ),
    Requirement(9, "A token that is not in force gets the fault `no lease`.", standing.dead_tokens),
    Requirement(10, "Each beat is answered with a `state` that echoes it, numbered upward.", standing.echoes),
    Requirement(11, "A command that comes again gets the same answer.", standing.answers_again),
    Requirement(12, "A command that was overtaken is not served.", standing.overtaken),
    Requirement(13, "A command without the ability for it gets `not able`.", standing.not_able),
    Requirement(14, "The robot stops by itself when its controller is silent.", moving.stops_in_silence, True),
    Requirement(15, "Beats that have heard nothing new do not keep it going.", moving.stops_for_old_beats, True),
    Requirement(16, "It drives on when the same goal is sent again, and not before.", moving.goes_on, True),
    Requirement(17, "A command that was under way for too long gets the fault `too old`.", standing.refuses_late),
    Requirement(18, "The same session takes its lease over, and the token before is dead.", standing.hands_over),
    Requirement(19, "`leave` ends the lease.", standing.leaves),
    Requirement(20, "A flood of junk does not keep it from serving others.", standing.bears_junk),
    Requirement(21, "A goal is driven to, ends `arrived` with the robot there, and stays so.", moving.drives, True),
    Requirement(22, "A goal is not driven twice, nor one that is older than the newest.", moving.not_twice, True),
    Requirement(23, "A halt ends the goal, and the robot stands.", moving.halts, True),
    Requirement(24, "Telemetry comes as often as asked for, with rising numbers and stamps.", standing.sees),
    Requirement(25, "No more telemetry is under way than the window allows.", standing.keeps_window),
    Requirement(26, "A frame that is too long does not keep it from serving others.", standing.bears_long_frames),
    Requirement(27, "The lease of a controller that stays silent ends after the term.", standing.lapses),
    Requirement(28, "After a restart it has another `boot`, and tokens from before are dead.", standing.restarts),
)
