"""The adapter trial: a program written from PROTOCOL.md passes, and each way of breaking it is found out."""

from __future__ import annotations

import json
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest

from backends.contract import Line
from backends.link.messages import Hello, encode, read_by_controller, read_by_robot
from backends.link.trial.requirements import REQUIREMENTS
from backends.link.trial.running import Result, Trial
from tests.backends.link.bare import PROTOCOL, adapter, changed, restartable

COMMAND = "from runner.cli import main; raise SystemExit(main())"
QUICK = (("SILENCE, TERM, SPEED = 1.0, 30.0, 1.0", "SILENCE, TERM, SPEED = 0.5, 5.0, 2.0"),)
"""The same program with a shorter silence and term, so that its trial takes half a minute."""

BROKEN: dict[str, tuple[str, tuple[str, str]]] = {
    "does not stop in silence": ("R14*", ("elif quiet > SILENCE and self.robot", "elif quiet > 1e9 and self.robot")),
    "takes old beats for signs of life": (
        "R15*",
        ('            self.alive(message["heard"])\n', '            lease["alive"] = now()\n'),
    ),
    "drives on by itself when beats come again": (
        "R16*",
        (
            'return self.tell(message["sent"])',
            'self.suspended and now() - lease["alive"] < SILENCE and self.go('
            '{"goal": self.goals[lease["session"]]["id"], "speed": 0.5}, lease["session"]); '
            'return self.tell(message["sent"])',
        ),
    ),
    "has two controllers": (
        "R8",
        ('if self.lease is not None and self.lease["session"] !=', "if False and self.lease !="),
    ),
    "drives a goal twice": ("R22*", ("            if not self.suspended:\n", "            if False:\n")),
    "does not look at the checksum": (
        "R3",
        (' or zlib.crc32(frame[4:]) != int.from_bytes(frame[:4], "big")', ""),
    ),
    "lets its tokens live on": (
        "R18",
        ('message["lease"] != lease["token"]', 'message["lease"] not in self.nonces.values()'),
    ),
    "queues telemetry for nobody": ("R25", (' and self.telemetry - lease["seen"] < lease["window"]', "")),
    "does not halt": (
        "R23*",
        ('        self.robot.stop()\n        self.end("halted")\n        if kind', "        if kind"),
    ),
    "serves what came late": ("R17", ('if "heard" in message and not self.alive(message["heard"]):', "if False:")),
    "serves what was overtaken": ("R12", ('if number <= lease["highest"]:', 'if number in lease["answers"]:')),
    "dies of junk": (
        "R3",
        (
            "    except (ValueError, RecursionError):\n        raise Bad(",
            "    except RecursionError:\n        raise Bad(",
        ),
    ),
}
"""Each way of breaking it: the requirement it must fail, and the change."""


ALL: tuple[int, ...] = ()
SOUND_STILL = (1, 6, 10)
"""Requirements that every broken adapter still keeps."""


def tried(text: str, only: tuple[int, ...]) -> list[Result]:
    """The trial of a program, in a process of its own."""
    with TemporaryDirectory(prefix="trl") as name, adapter(text, Path(name)) as address:
        trial = Trial.begin(Line(address))
        try:
            return list(trial.run(trial.box(ahead=1.5, speed=1.0), only=only))
        finally:
            trial.close()


@pytest.fixture(scope="module")
def trials() -> dict[str, list[Result]]:
    """The trials of the sound program and of all broken ones. They mostly wait, so they are run at the same time."""
    texts = {"sound": changed(*QUICK)} | {name: changed(*QUICK, change) for name, (_, change) in BROKEN.items()}
    only = [ALL, *((*SOUND_STILL, int(broken.strip("R*"))) for broken, _ in BROKEN.values())]
    with ThreadPoolExecutor(max_workers=len(texts)) as pool:
        return dict(zip(texts, pool.map(tried, texts.values(), only), strict=True))


def test_the_program_of_the_page_keeps_every_requirement(trials: dict[str, list[Result]]) -> None:
    assert [result for result in trials["sound"] if result.verdict == "fail"] == []
    assert [result.requirement for result in trials["sound"] if result.verdict == "not tried"] == ["R28"]


@pytest.mark.parametrize("name", BROKEN)
def test_an_adapter_broken_in_one_way_fails_on_the_requirement_for_it(
    trials: dict[str, list[Result]], name: str
) -> None:
    failed = {result.requirement: result.why for result in trials[name] if result.verdict == "fail"}
    assert list(failed) == [BROKEN[name][0]]
    assert all(failed.values()), "each failure says why"


@pytest.mark.parametrize(
    ("change", "verdict"),
    [
        ((), "pass"),
        ((("secrets.token_hex(16)\nENDS", '"b" * 32\nENDS'),), "fail"),
    ],
    ids=["sound", "the same boot each time"],
)
def test_a_restart_is_tried_where_somebody_does_it(change: tuple[tuple[str, str], ...], verdict: str) -> None:
    with TemporaryDirectory(prefix="trl") as name, restartable(changed(*QUICK, *change), Path(name)) as running:
        address, restart = running
        trial = Trial.begin(Line(address))
        try:
            results = list(trial.run(None, restart, only=(28,)))
        finally:
            trial.close()
    assert [(result.requirement, result.verdict) for result in results] == [("R28", verdict)]


def test_the_page_lists_the_requirements_in_the_words_of_the_trial() -> None:
    page = PROTOCOL.read_text(encoding="utf-8")
    for requirement in REQUIREMENTS:
        assert f"| {requirement.name} | {requirement.text} |" in page
        assert f"R{requirement.number}" in page.split("## 11.")[0] or requirement.number in (26, 27, 28)


def test_the_examples_of_the_page_are_messages() -> None:
    page = PROTOCOL.read_text(encoding="utf-8")
    assert encode(Hello([1])).hex() in page.replace("\n", "").replace(" ", "")
    lines = page.split("```json\n")[1].split("```")[0].strip().splitlines()
    assert len(lines) == 10
    for line in lines:
        kind = json.loads(line)["kind"]
        from_robot = kind in ("about", "granted", "done", "state", "telemetry", "fault")
        from backends.link.trial.attempt import framed

        (read_by_controller if from_robot else read_by_robot)(framed(line.encode()))


def test_the_command_writes_a_report_and_moves_nothing_without_a_yes(tmp_path: Path) -> None:
    with TemporaryDirectory(prefix="trl") as name, adapter(changed(*QUICK), Path(name)) as address:
        command = [sys.executable, "-c", COMMAND, "link", "try", address]
        refused = subprocess.run(
            command, capture_output=True, text=True, timeout=60, check=False, stdin=subprocess.DEVNULL
        )
        assert refused.returncode == 2
        assert "no safety device" in refused.stderr
        assert "Nothing was moved." in refused.stderr
        report = tmp_path / "report.json"
        command += ["--standing", "--only", "1", "2", "14", "28", "--json", str(report)]
        done = subprocess.run(command, capture_output=True, text=True, timeout=120, check=False)
    assert done.returncode == 0, done.stderr
    results = json.loads(report.read_text())["results"]
    assert [(result["requirement"], result["verdict"]) for result in results] == [
        ("R1", "pass"),
        ("R2", "pass"),
        ("R14*", "not tried"),
        ("R28", "not tried"),
    ]
