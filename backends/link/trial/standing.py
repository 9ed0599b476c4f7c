"""Requirements that are tried with the robot standing.

Each attempt has connections of its own and a session of its own; the trial closes them.
"""

from __future__ import annotations

import secrets
from collections.abc import Callable
from itertools import pairwise

from backends.link.messages import (
    FRAME_BYTES_MOST,
    VERSION,
    About,
    Beat,
    Clear,
    Done,
    EaseBack,
    Fault,
    Go,
    Granted,
    Halt,
    Hello,
    Leave,
    Relocate,
    Replan,
    Seen,
    State,
    Take,
    ToRobot,
    encode,
)
from backends.link.trial.attempt import Attempt, SkippedError, framed, session
from backends.link.trial.probe import FailedError, Probe

JUNK = 2_000
"""Frames of junk in a flood."""


def greets(attempt: Attempt) -> None:
    probe = attempt.connect()
    probe.send(Hello([VERSION]))
    about = probe.wait(About, seconds=1.0, what="`about`")
    if VERSION not in about.versions:
        raise FailedError(f"It does not speak version {VERSION}.")


def refuses_version(attempt: Attempt) -> None:
    probe = attempt.connect()
    probe.send(Take(99, session(), secrets.token_hex(16), "trial", 0.1, 10))
    probe.fault("version")


def refuses_unreadable(attempt: Attempt) -> None:
    probe = attempt.leased()
    good = encode(Hello([VERSION]))
    for frame in (b"", b"{}", good[:-1], good[:4] + good[4:].replace(b"1", b"2"), b"\0\0\0\0" + good[4:]):
        probe.send_frame(frame)
        probe.fault("not readable")
    for body in (b"not json", b'{"kind":"hello","versions":[1]', b'\xff\xfe{"kind":"hello"}'):
        probe.send_frame(framed(body))
        probe.fault("not readable")


def refuses_invalid(attempt: Attempt) -> None:
    probe = attempt.leased()
    lease = probe.token
    for body in (
        '{"kind":"hello"}',
        '{"kind":"hello","versions":[1],"more":1}',
        '{"kind":"hello","versions":"1"}',
        f'{{"kind":"beat","lease":"{lease}","sent":-1,"heard":0,"seen":0}}',
        f'{{"kind":"go","lease":"{lease}","number":1,"heard":0,"goal":1,"pose":[0,0],"speed":1}}',
        f'{{"kind":"go","lease":"{lease}","number":1,"heard":0,"goal":1,"pose":[0,1e9,0],"speed":1}}',
        f'{{"kind":"go","lease":"{lease}","number":1,"heard":0,"goal":1,"pose":[0,0,0],"speed":0}}',
        f'{{"kind":"halt","lease":"{lease}","number":1.5}}',
    ):
        probe.send_frame(framed(body.encode()))
        probe.fault("not valid")


def refuses_unknown(attempt: Attempt) -> None:
    probe = attempt.leased()
    probe.send_frame(framed(b'{"kind":"dance"}'))
    probe.fault("unknown message")


def grants(attempt: Attempt) -> None:
    probe = attempt.connect()
    granted = probe.take(session())
    if (granted.silence, granted.term) != (attempt.about.silence, attempt.about.term):
        raise FailedError("`granted` and `about` do not agree on silence and term.")
    state = probe.state
    if state is None or state.boot != granted.boot:
        raise FailedError("`state` and `granted` do not agree on the boot.")
    if state.goal is not None:
        raise FailedError("A new session begins with a goal that nobody gave.")


def repeats_grant(attempt: Attempt) -> None:
    probe = attempt.connect()
    request = Take(VERSION, session(), secrets.token_hex(16), "trial", 0.1, 10)
    tokens = []
    for _ in range(3):
        probe.send(request)
        probe.granted = probe.wait(Granted, what="`granted`")
        tokens.append(probe.granted.lease)
    if len(set(tokens)) != 1:
        raise FailedError("The same request for the lease got different tokens.")


def one_controller(attempt: Attempt) -> None:
    probe, other = attempt.leased(), attempt.connect()
    other.send(Take(VERSION, session(), secrets.token_hex(16), "second", 0.1, 10))
    other.fault("taken")
    sent = probe.beat()
    probe.wait(State, lambda state: state.echo == sent, what="`state` to the first controller afterwards")


def dead_tokens(attempt: Attempt) -> None:
    probe, other = attempt.leased(), attempt.connect()
    other.granted = probe.granted
    for message in (Beat("0" * 32, 1.0, probe.heard, 0), Halt("f" * 32, 1)):
        other.send(message)
        other.fault("no lease")
    other.granted = None
    probe.pump(0.2, beats=True)


def echoes(attempt: Attempt) -> None:
    probe = attempt.leased()
    numbers = []
    for _ in range(5):
        sent = probe.beat()
        state = probe.wait(State, lambda state, sent=sent: state.echo == sent, what="`state` with the beat's `sent`")  # type: ignore[misc]
        numbers.append(state.number)
    if numbers != sorted(set(numbers)):
        raise FailedError("The numbers of states do not count up.")


def answers_again(attempt: Attempt) -> None:
    probe = attempt.leased()
    number = probe.command(Halt)
    first = probe.wait(Done, lambda done: done.number == number, what="`done`")
    for _ in range(2):
        probe.send(Halt(probe.token, number))
        if probe.wait(Done, lambda done: done.number == number, what="`done` again") != first:
            raise FailedError("A command that came twice was answered in two ways.")


def overtaken(attempt: Attempt) -> None:
    probe = attempt.leased()
    probe.number = 10
    probe.halt()
    probe.send(Halt(probe.token, 5))
    if probe.outcome(5) != "overtaken":
        raise FailedError("A command that a later one had overtaken was not answered `overtaken`.")


def not_able(attempt: Attempt) -> None:
    probe = attempt.leased()
    heard = probe.heard
    pose = (0.0, 0.0, 0.0)
    makers: dict[str, Callable[[str, int], ToRobot]] = {
        "clear": lambda lease, number: Clear(lease, number, heard, 1, 1.0),
        "replan": lambda lease, number: Replan(lease, number, heard, 1),
        "ease back": lambda lease, number: EaseBack(lease, number, heard, 1, 0.1),
        "relocate": lambda lease, number: Relocate(lease, number, heard, 1, None),
        "relative moves": lambda lease, number: Go(lease, number, heard, 1, pose, 0.1, True),
    }
    lacking = [word for word in makers if word not in attempt.about.abilities]
    if not lacking:
        raise SkippedError("The robot has every ability.")
    for word in lacking:
        heard = probe.heard
        if probe.outcome(probe.command(makers[word])) != "not able":
            raise FailedError(f"It has no ability `{word}`, but did not answer `not able`.")
        probe.pump(0.05, beats=True)


def refuses_late(attempt: Attempt) -> None:
    probe = attempt.leased()
    probe.pump(attempt.about.silence + 0.3, beats=True)
    late = max(0.0, probe.heard - attempt.about.silence - 0.25)
    number = probe.command(lambda lease, number: Go(lease, number, late, 1, (0.0, 0.0, 0.0), 0.05))
    found = probe.wait(Fault, lambda fault: fault.code == "too old", what="the fault `too old`")
    if found.number != number:
        raise FailedError("The fault `too old` does not name the command's number.")
    if probe.state is not None and probe.state.goal is not None:
        raise FailedError("A command that was too old was served.")


def hands_over(attempt: Attempt) -> None:
    name = session()
    probe, again = attempt.connect(), attempt.connect()
    first = probe.take(name)
    second = again.take(name)
    if first.lease == second.lease:
        raise FailedError("A controller that was started again got the token of the one before.")
    probe.granted = None
    probe.send(Halt(first.lease, 1))
    probe.fault("no lease")


def leaves(attempt: Attempt) -> None:
    probe = attempt.leased()
    token = probe.token
    if probe.outcome(probe.command(Leave)) != "taken":
        raise FailedError("`leave` was not answered `taken`.")
    probe.granted = None
    probe.send(Beat(token, 1.0, probe.heard, 0))
    probe.fault("no lease")
    attempt.leased()


def bears_junk(attempt: Attempt) -> None:
    probe = attempt.leased()
    junk = attempt.connect()
    good = encode(Hello([VERSION]))
    for number in range(JUNK):
        junk.send_frame(bytes((number % 251,)) * (number % 40) + good[: number % len(good)])
        if number % 100 == 0:
            probe.beat()
            junk.pump(0.001)
    junk.pump(0.1)
    sent = probe.beat()
    probe.wait(State, lambda state: state.echo == sent, 3.0, "`state` during a flood of junk")


def bears_long_frames(attempt: Attempt) -> None:
    attempt.connect().send_frame(framed(b'{"kind":"hello","versions":[1' + b" " * FRAME_BYTES_MOST + b"]}"))
    attempt.leased()


def sees(attempt: Attempt) -> None:
    probe = attempt.connect()
    probe.take(session(), every=0.2)
    probe.pump(2.5, beats=True)
    found = probe.telemetry
    if len(found) < 2:
        raise FailedError(f"Only {len(found)} messages of telemetry came in 2.5 s.{_why(probe)}")
    if len(found) > 16:
        raise FailedError(f"{len(found)} messages of telemetry came in 2.5 s, though 0.2 s apart was asked for.")
    for before, after in pairwise(found):
        if after.number <= before.number or after.stamp <= before.stamp:
            raise FailedError("Numbers or stamps of telemetry do not rise.")


def _why(probe: Probe) -> str:
    return f" It sent what is no message: {probe.unread[-1]}" if probe.unread else ""


def keeps_window(attempt: Attempt) -> None:
    probe = attempt.connect()
    probe.take(session(), every=0.05, window=3)
    seen = probe.state.telemetry if probe.state else 0
    late: list[Seen] = []
    for _ in range(20):
        probe.send(Beat(probe.token, probe.now(), probe.heard, seen))
        late += [message for message in probe.pump(0.1) if isinstance(message, Seen) and message.number > seen]
    if len(late) > 4:
        raise FailedError(
            f"{len(late)} messages of telemetry came that nobody had said to have seen, with a window of 3."
        )


def lapses(attempt: Attempt) -> None:
    if attempt.about.term > 40.0:
        raise SkippedError(f"Its term of {attempt.about.term:g} s takes too long to wait for.")
    probe, other = attempt.leased(), attempt.connect()
    probe.granted = None
    probe.pump(attempt.about.term + 0.5)
    other.take(session())


def restarts(attempt: Attempt) -> None:
    if attempt.ask_restart is None:
        raise SkippedError("Nobody was asked to restart the adapter; say --restart.")
    before = attempt.leased().granted
    attempt.ask_restart()
    probe = attempt.connect()
    probe.pump(1.0)
    assert before is not None
    probe.send(Halt(before.lease, 1))
    probe.fault("no lease")
    if probe.take(session()).boot == before.boot:
        raise FailedError("After a restart it has the same `boot`.")
