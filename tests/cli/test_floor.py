"""`trundle floor` as a person uses it: a picture becomes a site, a site is drawn, mistakes are told in words."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from runner.language.reader import load_site
from runner.site.floor import rasterize

TRUNDLE = Path(sys.executable).parent / "trundle"
ROOT = Path(__file__).parents[2]


def trundle(*words: str | Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [TRUNDLE, *words],
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
        env={**os.environ, "TERM": "dumb"},
        cwd=ROOT,
        stdin=subprocess.DEVNULL,
    )


@pytest.fixture
def picture(tmp_path: Path) -> Path:
    """A room of 3 x 2 m with a pillar, as a portable graymap: white floor, black walls, gray where nobody looked."""
    gray = np.full((40, 60), 255, dtype=np.uint8)
    gray[0] = gray[-1] = gray[:, 0] = gray[:, -1] = 0
    gray[10:14, 20:24] = 30
    gray[30:39, 50:59] = 150
    path = tmp_path / "store-room.pgm"
    path.write_bytes(b"P5\n60 40\n255\n" + gray.tobytes())
    return path


@pytest.mark.parametrize("suffix", [".pgm", ".png"])
def test_a_picture_becomes_a_site_that_can_be_read(picture: Path, suffix: str) -> None:
    if suffix == ".png":
        image = pytest.importorskip("PIL.Image")
        image.open(picture).save(picture.with_suffix(".png"))
    made = trundle("floor", "import", picture.with_suffix(suffix), "--scale", "5 cm")
    assert (made.returncode, made.stderr) == (0, "")
    site = load_site(picture.with_suffix(".yaml"))
    solid = rasterize(site).solid
    assert solid.shape == (40, 60)
    assert int(solid.sum()) == 2 * 60 + 2 * 38 + 16 + 81
    assert (site.name, [place.name for place in site.places]) == ("Store room", ["middle"])


def test_a_site_is_not_written_over(picture: Path) -> None:
    assert trundle("floor", "import", picture, "--scale", "5 cm").returncode == 0
    again = trundle("floor", "import", picture, "--scale", "5 cm")
    assert again.returncode == 2
    assert "is there already" in again.stderr


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        ((), "How large is a pixel?"),
        (("--scale", "5"), '--scale "5"'),
        (("--scale", "5 m"), "from 2 mm to 1 m"),
        (("--scale", "5 cm", "--wall", "100-0"), "the darker first"),
        (("--scale", "5 cm", "--known", "1,2"), "as in 2.5,4=310,122"),
        (("--scale", "5 cm", "--known", "0,0=30,20"), "and a site begins at 0"),
        (("--scale", "5 cm", "--free", "254-254"), "Nothing in the picture is free floor"),
    ],
)
def test_a_mistake_is_told_in_words(picture: Path, words: tuple[str, ...], sentence: str) -> None:
    done = trundle("floor", "import", picture, *words)
    assert done.returncode == 2
    assert sentence in done.stderr
    assert "Traceback" not in done.stderr


def test_a_file_that_is_no_picture_is_refused(tmp_path: Path) -> None:
    (tmp_path / "words.png").write_text("not a picture")
    done = trundle("floor", "import", tmp_path / "words.png", "--scale", "5 cm")
    assert (done.returncode, "is not a picture" in done.stderr) == (2, True)
    assert "There is no file" in trundle("floor", "import", tmp_path / "none.png", "--scale", "5 cm").stderr


def test_a_site_is_drawn_in_80_columns_with_every_place_and_door() -> None:
    shown = trundle("floor", "show", ROOT / "missions/sites/harbour-clinic.yaml", "--ascii")
    assert (shown.returncode, shown.stderr) == (0, "")
    assert shown.stdout.isascii()
    assert max(map(len, shown.stdout.splitlines())) <= 80
    site = load_site(ROOT / "missions/sites/harbour-clinic.yaml")
    for thing in (*site.places, *site.doors):
        assert thing.name in shown.stdout


def test_a_site_with_a_mistake_is_not_drawn(tmp_path: Path) -> None:
    (tmp_path / "site.yaml").write_text("site: Half\n")
    shown = trundle("floor", "show", tmp_path / "site.yaml")
    assert shown.returncode == 2
    assert "error:" in shown.stderr
