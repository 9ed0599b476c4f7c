"""A record is verified by its chain and by the engine; a changed one says where the two part."""

from __future__ import annotations

import sqlite3
from pathlib import Path

from runner.host.board import Board
from runner.host.launch import Order, carry_out
from runner.journal.reader import open_record
from runner.journal.replay import Verdict, verify
from runner.machine.compiler import compile_mission
from runner.site.values import Conditions
from tests.builders import FAR, HOME, mission, repeat, visit


def test_a_long_run_verifies_and_a_changed_one_says_where(tmp_path: Path) -> None:
    written = mission(repeat(visit([FAR, HOME]), seconds=1500.0))
    carry_out(Order(written, compile_mission(written), Conditions(), None, 1, None), tmp_path, Board("m"), lambda: None)
    sound = verdict(tmp_path)
    assert sound.sound
    with open_record(tmp_path) as record:
        assert len(record.snapshots()) >= 2
    with sqlite3.connect(tmp_path / "journal.sqlite") as connection:
        changed = connection.execute("SELECT seq FROM entry WHERE name = 'leg ended' LIMIT 1").fetchone()[0]
        connection.execute("UPDATE entry SET body = replace(body, 'arrived', 'failed') WHERE seq = ?", (changed,))
    found = verdict(tmp_path)
    assert found.chain_broken_at == changed
    assert found.parting is not None
    assert found.parting.entry == changed


def verdict(folder: Path) -> Verdict:
    with open_record(folder) as record:
        return verify(record)
