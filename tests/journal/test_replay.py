"""What is in the record is all the engine was told: given again, it makes the same commands and notes."""

from __future__ import annotations

from pathlib import Path

from runner.engine.advance import advance
from runner.engine.state import initial_state
from runner.engine.values import Effect, IncidentBegan, Input
from runner.host.board import Board
from runner.host.launch import Order, carry_out
from runner.journal.reader import Record, chain_break, open_record
from runner.machine.codec import from_json
from runner.machine.compiler import compile_mission
from runner.site.values import Carton, Conditions, Walkers
from tests.builders import FAR, HOME, go, mission, wait


def inputs_of(record: Record) -> list[Input]:
    """Inputs and telemetry in the order in which they came: after entry n stands the telemetry of n."""
    kept = [((entry.seq, 0, 0), entry.value) for entry in record.entries() if entry.kind == "input"]
    kept += [((row.after_entry, 1, row.seq), row.seen) for row in record.track()]
    return [value for _, value in sorted(kept, key=lambda one: one[0])]  # type: ignore[misc]


def test_a_recorded_run_with_an_incident_replays_to_the_same_effects(tmp_path: Path) -> None:
    in_the_way = Carton(at=(6.0, 1.5), size=(0.4, 2.9), until_s=40.0)
    conditions = Conditions(name="in the way", cartons=(in_the_way,), walkers=(Walkers(2),))
    written = mission(go(FAR), wait(2.0), go(HOME))
    carry_out(
        Order(written, compile_mission(written), conditions, None, 3, None), tmp_path, Board("mara"), lambda: None
    )

    with open_record(tmp_path) as record:
        assert chain_break(record) is None
        machine = from_json(record.machine_json)
        state = initial_state(machine)
        again: list[Effect] = []
        for given in inputs_of(record):
            state, effects = advance(machine, state, given)
            again += effects
        assert again == [entry.value for entry in record.entries() if entry.kind != "input"]
        assert len(list(record.track())) > 50
        assert any(isinstance(effect, IncidentBegan) for effect in again)
