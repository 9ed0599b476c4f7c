"""A move seen from the robot leads to no place of the floor, so no way is measured from where it would be."""

from __future__ import annotations

from runner.language.mission import Mission
from runner.machine.compiler import compile_mission
from runner.site.values import Place
from tests.language import texts


def test_the_shortest_way_begins_at_the_place_before_a_move() -> None:
    asked: list[tuple[str, ...]] = []

    def lengths(_: Mission, places: tuple[Place, ...]) -> tuple[tuple[float, ...], ...]:
        asked.append(tuple(place.name for place in places))
        return tuple(tuple(float(one != other) for other in places) for one in places)

    body = "steps:\n  - go: laboratory\n  - go: back 1 m\n  - visit: [ward east, laboratory]\n    order: shortest\n"
    compile_mission(texts.mission(body), lengths)
    assert asked == [("laboratory", "ward east", "laboratory")]
