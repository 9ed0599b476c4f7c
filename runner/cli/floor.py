"""`trundle floor`: a site file out of a picture of the floor, and a site drawn in the terminal."""

from __future__ import annotations

import argparse
import os
import re
import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, TypeVar

from runner.cli.exits import Exit

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from runner.site.picture import Kinds

Value = TypeVar("Value")

PILLOW_MISSING = "Reading pictures needs the package Pillow. Install it with: pip install pillow"
KNOWN = re.compile(r"\s*(-?[\d.]+)\s*,\s*(-?[\d.]+)\s*=\s*(\d+)\s*,\s*(\d+)\s*")
GRAYS = re.compile(r"\s*(\d{1,3})\s*-\s*(\d{1,3})\s*")


def add_parser(subparsers: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = subparsers.add_parser(
        "floor",
        help="make a site from a picture of a floor, or draw a site",
        description="Makes a site file from a picture of a floor, or draws a site with its places and clearances.",
    )
    parts = parser.add_subparsers(dest="part", metavar="WHAT", required=True)
    made = parts.add_parser("import", help="make a site from a picture (PNG or PGM); what is not given is asked for")
    made.add_argument("image", metavar="IMAGE", type=Path)
    made.add_argument("--scale", metavar="LENGTH", help='the side of a pixel, as "5 cm"')
    made.add_argument(
        "--known",
        metavar="X,Y=COLUMN,ROW",
        help="a point of the site, in meters, and its pixel, counted from the top left",
    )
    made.add_argument("--wall", metavar="GRAYS", help="which grays are wall, 0 is black: 0-100")
    made.add_argument("--free", metavar="GRAYS", help="which grays are free floor, 255 is white: 200-255")
    made.add_argument("--name", metavar="NAME", help="the name of the site (that of the picture)")
    made.add_argument("--out", metavar="FILE", type=Path, help="where to write it (beside the picture)")
    shown = parts.add_parser("show", help="draw a site, with its places and clearances")
    shown.add_argument("site", metavar="SITE", help="a site file")
    shown.add_argument("--ascii", action="store_true", help="plain characters only")


def run(arguments: argparse.Namespace) -> int:
    return _show(arguments) if arguments.part == "show" else _import(arguments)


class _MistakeError(Exception):
    """What the person is told instead of a site."""


def _show(arguments: argparse.Namespace) -> int:
    from runner.language.diagnostics import LanguageError
    from runner.language.reader import load_site
    from runner.screen.terminal import ascii_only
    from runner.site.sketch import ASCII, DRAWN, sketch

    try:
        site = load_site(Path(arguments.site))
    except LanguageError as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    print(sketch(site, 80, ASCII if arguments.ascii or ascii_only(os.environ, sys.stdout.encoding) else DRAWN))
    return Exit.OK


def _import(arguments: argparse.Namespace) -> int:
    from runner.site.picture import PictureError

    try:
        text, cells = _site_of(arguments)
        out = arguments.out or arguments.image.with_suffix(".yaml")
        with out.open("x", encoding="utf-8") as file:
            file.write(text)
    except (PictureError, _MistakeError) as error:
        print(error, file=sys.stderr)
        return Exit.MISTAKE
    except FileExistsError:
        print(f"{out} is there already. Name another file with --out.", file=sys.stderr)
        return Exit.MISTAKE
    except OSError as error:
        print(f"{out} cannot be written: {error.strerror}.", file=sys.stderr)
        return Exit.MISTAKE
    free = float((cells == 0).mean())
    print(f"{out}: {text.count('rectangle')} rectangles, {free:.0%} of the floor free.")
    print(f"Look at it: trundle floor show {out}")
    return Exit.OK


def _site_of(arguments: argparse.Namespace) -> tuple[str, Kinds]:
    """The text of the site file, and its cells."""
    from runner.site.picture import Placing, cells_of_picture, kinds_of, placed_by, site_text

    gray, seen = _gray(arguments.image)
    scale = _given(arguments.scale, "The side of a pixel (as 5 cm)", "--scale", "5 cm", _length)
    wall = _given(arguments.wall, "Which grays are wall (0 is black)", "--wall", "0-100", _grays)
    free = _given(arguments.free, "Which grays are free floor (255 is white)", "--free", "200-255", _grays)
    known = _given(
        arguments.known, "A known point, x,y=column,row (empty: the lower left corner is 0,0)", "--known", "", _known
    )
    kinds = kinds_of(gray, wall, free)
    kinds[~seen] = 1
    placing = Placing(scale) if known is None else placed_by(scale, known[:2], *known[2:], rows=gray.shape[0])
    cells = cells_of_picture(kinds, placing)
    remark = (
        f"Made from {arguments.image.name}: a pixel is {scale:g} m, wall is gray {wall[0]}-{wall[1]}, "
        f"free is {free[0]}-{free[1]}."
    )
    name = (arguments.name or arguments.image.stem).replace("-", " ").replace("_", " ").capitalize()
    return site_text(f'"{name}"' if not name.replace(" ", "").isalnum() else name, cells, remark), cells


def _gray(path: Path) -> tuple[NDArray[np.uint8], NDArray[np.bool_]]:
    """The picture in gray, shape (rows, columns), and which of its pixels are not transparent."""
    import numpy as np

    try:
        from PIL import Image, UnidentifiedImageError
    except ImportError:
        raise _MistakeError(PILLOW_MISSING) from None
    try:
        with Image.open(path) as image:
            both = np.asarray(image.convert("LA"))
    except FileNotFoundError:
        raise _MistakeError(f"There is no file {path}.") from None
    except (UnidentifiedImageError, OSError, ValueError, SyntaxError, Image.DecompressionBombError):
        raise _MistakeError(f"{path} is not a picture that can be read. PNG and PGM can.") from None
    return both[:, :, 0].copy(), both[:, :, 1] >= 128


def _given(text: str | None, question: str, option: str, default: str, read: Callable[[str], Value]) -> Value:
    """What was given, or asked for at a terminal, or the default where nobody can be asked."""
    if text is not None:
        return _read(text, option, read)
    if not (sys.stdin.isatty() and sys.stdout.isatty()):
        if option == "--scale":
            raise _MistakeError('How large is a pixel? Say it with --scale, as in --scale "5 cm".')
        return read(default)
    while True:
        shown = f" [{default}]" if default else ""
        try:
            return _read(input(f"{question}{shown}: ") or default, option, read)
        except EOFError:
            raise _MistakeError("Nothing was made.") from None
        except _MistakeError as error:
            print(error, file=sys.stderr)


def _read(text: str, option: str, read: Callable[[str], Value]) -> Value:
    from runner.language.quantities import PhraseError

    try:
        return read(text)
    except PhraseError as error:
        raise _MistakeError(f'{option} "{text}": {error.sentence}') from None
    except ValueError as error:
        raise _MistakeError(f'{option} "{text}": {error}') from None


def _length(text: str) -> float:
    from runner.language.quantities import LENGTH, parse_quantity

    length = parse_quantity(text, LENGTH)
    if not 0.002 <= length <= 1.0:
        raise ValueError("A pixel is from 2 mm to 1 m wide.")
    return length


def _grays(text: str) -> tuple[int, int]:
    match = GRAYS.fullmatch(text)
    low, high = (int(match[1]), int(match[2])) if match else (1, 0)
    if low > high or high > 255:
        raise ValueError("Write two grays from 0 to 255, the darker first, as in 0-100.")
    return low, high


def _known(text: str) -> tuple[float, float, int, int] | None:
    if not text.strip():
        return None
    match = KNOWN.fullmatch(text)
    if match is None:
        raise ValueError("Write x and y in meters and the pixel, as in 2.5,4=310,122.")
    return float(match[1]), float(match[2]), int(match[3]), int(match[4])
