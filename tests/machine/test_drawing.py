"""The machine as text and as graphs: complete, and in the languages they claim to be."""

from __future__ import annotations

import re

from runner.machine.compiler import compile_mission
from runner.machine.drawing import as_dot, as_mermaid, as_text
from tests.builders import FAR, SIDE, go, mission, repeat, wait

MACHINE = compile_mission(mission(go(FAR), repeat(go(SIDE), wait(90.0), times=3), end_by=6 * 3600.0))


def test_the_table_shows_every_state_row_and_exit() -> None:
    text = as_text(MACHINE)
    for fragment in MACHINE.fragments.values():
        assert f"[{fragment.name}]" in text
        for state in fragment.states:
            assert re.search(rf"^  \d+ {re.escape(state.name)}$", text, re.MULTILINE)
    assert "no route -> 2 choose; open incident" in text
    assert "stalled: under 0.3 m of progress in 12 s" in text
    assert "end by: 06:00" in text
    assert re.search(r"^ +body -> \d+\.0 line 1: go to side$", text, re.MULTILINE)


def test_the_graphs_name_every_state_once_and_draw_edges_only_between_them() -> None:
    for draw, node, edge in (
        (as_dot, r"^    (b\d+s\d+) \[label=", r"^  (b\d+s\d+) -> (b\d+s\d+) \["),
        (as_mermaid, r'^    state ".*" as (b\d+s\d+)$', r"^  (b\d+s\d+) --> (b\d+s\d+) :"),
    ):
        text = draw(MACHINE)
        nodes = re.findall(node, text, re.MULTILINE)
        edges = re.findall(edge, text, re.MULTILINE)
        states = sum(len(MACHINE.fragments[block.fragment].states) for block in MACHINE.blocks)
        assert len(nodes) == len(set(nodes)) == states
        assert edges
        assert {end for pair in edges for end in pair} <= set(nodes)


def test_a_name_with_quotes_and_colons_cannot_break_a_graph() -> None:
    from dataclasses import replace

    tricky = replace(MACHINE, name='round "A": first; then \\ B')
    assert as_dot(tricky).splitlines()[0] == "digraph \"round 'A' - first, then / B\" {"
