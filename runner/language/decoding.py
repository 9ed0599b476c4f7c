"""Bytes to text: what is too large, not UTF-8 or holds invisible characters is refused, with its place."""

from __future__ import annotations

import re
from collections.abc import Callable

BYTES_MOST = 1_000_000
"""A mission of ten thousand steps takes under 800 kB; whatever is larger is not a mission."""

Report = Callable[[int, int, int, str, str], None]
"""Takes line and column counted from 0, width, sentence, help."""

_CONTROL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff\ud800-\udfff]")
"""Among them all line ends but LF and CR, so that everybody counts lines alike."""


def decode(data: bytes, report: Report) -> str | None:
    """The text of a file without a byte order mark, or None after a report."""
    if len(data) > BYTES_MOST:
        report(0, 0, 1, "This file is larger than 1 MB.", "Take out of it what does not belong to the mission.")
        return None
    try:
        text = data.decode("utf-8").removeprefix("\ufeff")
    except UnicodeDecodeError as error:
        line, column = _place_after(data[: error.start].decode("utf-8").removeprefix("\ufeff"))
        report(line, column, 1, "This file is not UTF-8 text from here on.", "Save it as UTF-8 in your editor.")
        return None
    control = _CONTROL.search(text)
    if control:
        line, column = _place_after(text[: control.start()])
        code = f"U+{ord(control.group()):04X}"
        report(line, column, 1, f"There is an invisible control character here, {code}.", "Delete it.")
        return None
    return text


def _place_after(text: str) -> tuple[int, int]:
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    return len(lines) - 1, len(lines[-1])
