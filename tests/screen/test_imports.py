"""What runs without a screen loads no screen."""

from __future__ import annotations

import subprocess
import sys

import pytest


@pytest.mark.parametrize(
    "module",
    ["runner.engine", "runner.engine.values", "runner.host.view", "runner.journal", "runner.screen.plain",
     "runner.screen.terminal", "runner.screen.showing"],
)  # fmt: skip
def test_no_textual_is_loaded_by(module: str) -> None:
    program = f"import sys, {module}; sys.exit(any(name.split('.')[0] in ('textual', 'rich') for name in sys.modules))"
    assert subprocess.run([sys.executable, "-c", program], check=False).returncode == 0


def test_the_screen_knows_neither_host_nor_engine_beyond_what_it_is_told() -> None:
    program = (
        "import sys, runner.screen.watch\n"
        "known = {name for name in sys.modules if name.startswith('runner.') and name.count('.') == 2}\n"
        "rooms = {name for name in known if name.split('.')[1] in ('host', 'engine', 'journal', 'report', 'cli')}\n"
        "told = {'runner.host.view', 'runner.host.messages'}\n"
        "sys.exit(str(rooms - told) if rooms - told else 0)\n"
    )
    done = subprocess.run([sys.executable, "-c", program], check=False, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr


def test_engine_host_and_journal_are_whole_where_textual_is_not_installed() -> None:
    program = (
        "import importlib, importlib.abc, pkgutil, sys\n"
        "class Absent(importlib.abc.MetaPathFinder):\n"
        "    def find_spec(self, name, path, target=None):\n"
        "        if name.split('.')[0] in ('textual', 'rich'):\n"
        "            raise ModuleNotFoundError(name)\n"
        "sys.meta_path.insert(0, Absent())\n"
        "names = []\n"
        "for room in ('engine', 'host', 'journal'):\n"
        "    package = importlib.import_module(f'runner.{room}')\n"
        "    names += [found.name for found in pkgutil.iter_modules(package.__path__, f'runner.{room}.')]\n"
        "for name in names:\n"
        "    importlib.import_module(name)\n"
        "print(len(names))\n"
    )
    done = subprocess.run([sys.executable, "-c", program], check=False, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    assert int(done.stdout) > 20
