"""When a leg counts as stalled or swaying: by remaining route length, never by distance moved."""

from __future__ import annotations

from runner.engine.progress import Progress, look
from runner.engine.values import Seen
from runner.machine.table import Event, Watch
from runner.site.values import Pose

WATCH = Watch(progress=0.3, window=12.0)


def seen(stamp: float, remaining: float | None, driven: float = 0.0, route: int = 1) -> Seen:
    return Seen(stamp, Pose(0.0, 0.0, 0.0), 0.0, 0.0, 1.0, driven, remaining, route, (), ())


def follow(*samples: Seen) -> list[tuple[float, Event]]:
    """The events, with their stamps, of a drive that begins at stamp 0."""
    progress, events = Progress(mark_stamp=0.0), []
    for sample in samples:
        progress, event = look(progress, WATCH, sample)
        if event is not None:
            events.append((sample.stamp, event))
    return events


def test_a_robot_that_stands_still_is_stalled_once_the_window_has_passed() -> None:
    events = follow(*(seen(t / 4, 5.0) for t in range(1, 49)))
    assert events == [(12.0, Event.STALLED)]


def test_a_robot_just_fast_enough_is_never_stalled() -> None:
    slow = (seen(t / 4, 50.0 - 0.027 * t / 4, 0.027 * t / 4) for t in range(1, 2000))
    assert {event for _, event in follow(*slow)} == {Event.PROGRESSED}


def test_a_robot_a_little_too_slow_is_stalled() -> None:
    events = follow(*(seen(t / 4, 50.0 - 0.0245 * t / 4) for t in range(1, 60)))
    assert events[0] == (12.0, Event.STALLED)


def test_without_any_route_the_window_passes_all_the_same() -> None:
    assert follow(*(seen(float(t), None) for t in range(1, 13))) == [(12.0, Event.STALLED)]


def test_a_detour_is_not_a_stall_as_long_as_the_robot_gets_on_along_it() -> None:
    direct = [seen(t / 4, 10.0 - 0.1 * t / 4, 0.1 * t / 4) for t in range(1, 40)]
    detour = [seen(10.0 + t / 4, 15.0 - 0.1 * t / 4, 1.0 + 0.1 * t / 4, 2) for t in range(400)]
    assert {event for _, event in follow(*direct, *detour)} == {Event.PROGRESSED}


def test_flipping_between_two_routes_while_standing_still_is_a_stall() -> None:
    flips = [seen(t / 4, 10.0 if t % 8 < 4 else 25.0, route=t // 4) for t in range(1, 49)]
    assert follow(*flips) == [(12.0, Event.STALLED)]


def test_shuttling_between_two_routes_is_swaying() -> None:
    """Two meters along one route, two back along the other, for ever: marks are made, nothing is gained."""
    events, progress = [], Progress(mark_stamp=0.0)
    driven = 0.0
    for number in range(40):
        start = 10.0 if number % 2 == 0 else 12.0
        for step in range(20):
            driven += 0.1
            sample = seen(number * 20.0 + step, start - 0.1 * step, driven, number)
            progress, event = look(progress, WATCH, sample)
            events.append(event)
    assert Event.SWAYING in events
    assert Event.STALLED not in events


def test_driving_back_and_forth_along_one_route_is_a_stall() -> None:
    there_and_back = [seen(t / 4, 5.0 - 0.1 * (t % 8 if t % 16 < 8 else 8 - t % 8) / 4, t * 0.1) for t in range(1, 60)]
    assert (12.0, Event.STALLED) in [(stamp, event) for stamp, event in follow(*there_and_back)][:1]


def test_what_was_driven_before_there_is_a_route_is_no_swaying() -> None:
    assert follow(seen(0.25, None, driven=50.0), seen(0.5, 8.0, driven=50.0)) == []
