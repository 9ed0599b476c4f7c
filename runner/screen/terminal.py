"""What a terminal can show, judged from its environment; and text made safe for it.

No import of Textual here: the plain output needs this too.
"""

from __future__ import annotations

import os
import unicodedata
from collections.abc import Mapping
from typing import TextIO

_LINE_ONLY = ("", "dumb", "unknown")
_PLAIN_FONT = ("linux", "vt100", "vt102", "vt220")
"""Terminals whose built-in font has no dot patterns and few arrows."""

_SPELLED = str.maketrans(
    {"\u2013": "-", "\u2014": "-", "\u2018": "'", "\u2019": "'", "\u201c": '"', "\u201d": '"', "\u2026": "..."}
    | {"\u00b7": "-", "\u00d7": "x", "\u2192": "->", "\u00df": "ss", "\u00e6": "ae", "\u00f8": "o", "\u0142": "l"}
)


def suitable(*streams: TextIO) -> bool:
    """Whether a screen can be shown: every stream (the screen reads stdin and draws on stderr) is a terminal that can
    move its cursor."""
    if os.environ.get("TERM", "").lower() in _LINE_ONLY:
        return False
    return all(_is_terminal(stream) for stream in streams)


def _is_terminal(stream: TextIO) -> bool:
    try:
        return stream.isatty()
    except ValueError:  # closed
        return False


def ascii_only(environment: Mapping[str, str], encoding: str | None) -> bool:
    """Whether to draw with ASCII alone.

    TRUNDLE_ASCII decides if it is set (0 or empty: no). Otherwise the terminal, the locale (the first set of LC_ALL,
    LC_CTYPE and LANG, as POSIX has it) and the stream's encoding must all allow more.
    """
    wish = environment.get("TRUNDLE_ASCII")
    if wish is not None:
        return wish not in ("", "0")
    if environment.get("TERM", "").lower() in _PLAIN_FONT:
        return True
    locale = next((environment[name] for name in ("LC_ALL", "LC_CTYPE", "LANG") if environment.get(name)), "UTF-8")
    return not (_is_utf8(locale) and _is_utf8(encoding or "UTF-8"))


def _is_utf8(name: str) -> bool:
    return "UTF8" in name.upper().replace("-", "")


def clean(text: str) -> str:
    """One line without control characters: what a robot or a mission says cannot steer the terminal."""
    return "".join(" " if char in "\t\n\r" else "?" if _controls(char) else char for char in text)


def _controls(char: str) -> bool:
    return not char.isprintable() and unicodedata.category(char) in ("Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp")


def to_ascii(text: str) -> str:
    """The nearest ASCII spelling: accents dropped, the usual marks spelled out, the rest a question mark."""
    plain = unicodedata.normalize("NFKD", text.translate(_SPELLED))
    return "".join(
        char if char.isascii() else "?" for char in plain if unicodedata.category(char) not in ("Mn", "Me", "Mc")
    )
