"""The process that owns a run is killed at random moments. Nothing acknowledged is lost, no goal is driven twice."""

from __future__ import annotations

import os
import time
from dataclasses import dataclass
from pathlib import Path
from random import Random

import pytest

from runner.engine.values import Go
from runner.host.messages import Deed
from runner.host.remote import UnreachableError, do
from runner.journal.errors import JournalError
from runner.journal.outcome import RunOutcome, outcome_of
from runner.journal.reader import Status, open_record
from runner.journal.replay import verify
from tests.faults.hosts import Nursery, nursery

LIVES_S = 0.45
"""A host lives up to so long: long enough to get somewhere, short enough to be killed while it starts."""


@dataclass(slots=True)
class Toll:
    """What was done to the runs so far."""

    kills: int = 0
    runs: int = 0
    said: int = 0


def kill_again_and_again(nursed: Nursery, folder: Path, chance: Random, toll: Toll, most: int) -> None:
    """One run, killed until it has ended. After each kill the record must hold what was acknowledged, and be sound."""
    host = nursed.begin(folder)
    remarks: list[str] = []
    seen: dict[int, str] = {}
    while True:
        time.sleep(chance.uniform(0.0, LIVES_S))
        if toll.kills < most:
            if chance.random() < 0.4:
                remark = acknowledged_remark(folder, toll)
                remarks += [remark] if remark else []
            seen |= entries_of(folder)
            nursed.kill(host)
            toll.kills += 1
        else:
            nursed.wait(host)
        kept = entries_of(folder)
        assert all(kept.get(seq) == digest for seq, digest in seen.items()), "an entry that could be read is gone"
        if not kept:  # killed before the run began
            for file in folder.iterdir() if folder.exists() else []:
                file.unlink()
            host = nursed.begin(folder)
            continue
        if sound(folder, remarks) is Status.ENDED:
            return
        host = nursed.pick_up(folder)


def acknowledged_remark(folder: Path, toll: Toll) -> str:
    """A remark that the host says is in the record; nothing where it did not come to that."""
    toll.said += 1
    text = f"remark {toll.said}"
    try:
        return text if do(folder, Deed.SAY, text, 0.3).accepted else ""
    except (UnreachableError, OSError):
        return ""


def entries_of(folder: Path) -> dict[int, str]:
    try:
        with open_record(folder) as record:
            return {entry.seq: entry.digest for entry in record.entries()}
    except JournalError:
        return {}


def sound(folder: Path, remarks: list[str]) -> Status:
    with open_record(folder) as record:
        verdict = verify(record)
        assert verdict.sound, verdict
        bodies = " ".join(entry.body for entry in record.entries(names=("remark",)))
        assert all(f'"{remark}"' in bodies for remark in remarks)
        return record.status


def goals_sent(folder: Path) -> list[int]:
    with open_record(folder) as record:
        return [entry.value.goal_id for entry in record.entries(names=("go",)) if isinstance(entry.value, Go)]


def slaughter(folder: Path, seed: int, most: int, trouble: bool, laps: int = 2) -> Toll:
    """Run after run, until so many hosts were killed; each run is driven to its end."""
    folder.mkdir(exist_ok=True)
    toll, chance = Toll(), Random(seed)  # noqa: S311
    print(f"seed {seed}")
    while toll.kills < most:
        toll.runs += 1
        place = folder / str(toll.runs)
        place.mkdir()
        with nursery(place, laps=laps, trouble=trouble) as nursed:
            kill_again_and_again(nursed, place / "run", chance, toll, most)
            begun = [note["number"] for note in nursed.robots_account() if note["what"] == "begin"]
        sent = goals_sent(place / "run")
        assert begun == sent, "the robot began other goals than the record has, or one twice"
        assert sent == list(range(1, len(sent) + 1))
        if not trouble:  # nothing went wrong but the hosts, so that it is just the goals of the mission
            assert len(sent) == 3 * laps
        with open_record(place / "run") as record:
            allowed = (RunOutcome.ALL_ARRIVED, RunOutcome.SOME_MISSED) if trouble else (RunOutcome.ALL_ARRIVED,)
            assert outcome_of(record) in allowed
    return toll


SEED = int(os.environ.get("TRUNDLE_FAULTS_SEED", "20261201"))


@pytest.mark.parametrize("trouble", [False, True], ids=["smooth robot", "robot in trouble"])
def test_runs_survive_the_death_of_their_hosts(tmp_path: Path, trouble: bool) -> None:
    toll = slaughter(tmp_path, SEED + trouble, most=20, trouble=trouble)
    assert toll.kills == 20


@pytest.mark.soak
def test_three_hundred_deaths(tmp_path: Path) -> None:
    smooth = slaughter(tmp_path / "smooth", SEED, most=150, trouble=False, laps=5)
    trouble = slaughter(tmp_path / "trouble", SEED + 1, most=150, trouble=True, laps=5)
    assert (smooth.kills, trouble.kills) == (150, 150)
