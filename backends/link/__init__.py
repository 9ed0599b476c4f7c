"""A robot on a socket, by the protocol that PROTOCOL.md describes.

Importing this is cheap; `create` loads the rest.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from backends.contract import Backend, Setup


def create(setup: Setup) -> Backend:
    """A robot at `setup.line`. BackendError, with a sentence, where the line cannot be used."""
    from backends.link.client import LinkBackend

    return LinkBackend(setup)
