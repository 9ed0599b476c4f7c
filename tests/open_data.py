"""Where the open data for tests lies: beside the checkout, or in the folder named by TRUNDLE_OPEN_DATA."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

BESIDE = Path(__file__).resolve().parents[2] / "shared" / "data"


def open_data(name: str) -> Path:
    """The folder of that name. The test is skipped, saying so, where it is absent."""
    folder = Path(os.environ.get("TRUNDLE_OPEN_DATA", BESIDE)) / name
    if not folder.is_dir():
        pytest.skip(f"The open data {folder} are not here; set TRUNDLE_OPEN_DATA to their folder.")
    return folder
