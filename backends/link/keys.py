"""Keys of the link: files that hold them, made with the right modes and refused with the wrong ones.

A pair is two files: NAME.secret, for its owner's eyes only, and NAME.public, to be carried to the other side. Each
holds one line: the key in the 40 characters of Z85 (ZeroMQ RFC 32). An allow list is a folder of public keys, or one of
them. A secret is read from its file by whoever needs it, and is never an argument, a log line or part of a record.
"""

from __future__ import annotations

import os
from pathlib import Path

import zmq
import zmq.utils.z85

from backends.contract import BackendError

SECRET, PUBLIC = ".secret", ".public"
KEY_CHARACTERS = 40


def make_pair(folder: Path, name: str) -> tuple[Path, Path]:
    """A new pair of files. BackendError where one of them is there already: a key is never written over."""
    folder.mkdir(parents=True, exist_ok=True, mode=0o700)
    public_key, secret_key = zmq.curve_keypair()
    secret, public = folder / f"{name}{SECRET}", folder / f"{name}{PUBLIC}"
    for path in (secret, public):
        if path.exists():
            raise BackendError(f"{path} is there already. Remove it first, or choose another name.")
    _write(secret, secret_key, 0o600)
    _write(public, public_key, 0o644)
    return secret, public


def _write(path: Path, key: bytes, mode: int) -> None:
    descriptor = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL, mode)
    with os.fdopen(descriptor, "wb") as file:
        file.write(key + b"\n")


def read_secret(path: Path) -> bytes:
    """The secret key in a file. BackendError where others may read it, or where it is no key."""
    try:
        mode = path.stat().st_mode
    except OSError as error:
        raise BackendError(f"{path} cannot be read: {error.strerror}.") from None
    if mode & 0o077:
        raise BackendError(f"{path} may be read by others. Write: chmod 600 {path}")
    return _read(path)


def read_public(path: Path) -> bytes:
    """The public key in a file. BackendError where there is none."""
    if path.suffix == SECRET:
        raise BackendError(f"{path} is a secret key. The public one is {path.with_suffix(PUBLIC).name}.")
    return _read(path)


def read_allowed(path: Path) -> dict[bytes, str]:
    """Public keys and their names: those of a folder, or of one file. BackendError where there is none at all."""
    files = sorted(path.glob(f"*{PUBLIC}")) if path.is_dir() else [path]
    if not files:
        raise BackendError(f"There is no file *{PUBLIC} in {path}, so nobody would be admitted.")
    return {read_public(file): file.stem for file in files}


def public_of(secret: bytes) -> bytes:
    """The public key that belongs to a secret one."""
    return zmq.curve_public(secret)


def _read(path: Path) -> bytes:
    try:
        key = path.read_bytes().strip()
    except OSError as error:
        raise BackendError(f"{path} cannot be read: {error.strerror}.") from None
    try:
        if len(key) == KEY_CHARACTERS and len(zmq.utils.z85.decode(key)) == 32:
            return key
    except (ValueError, KeyError, OverflowError):
        pass
    raise BackendError(f"{path} holds no key. Keys are made by: trundle link keys NAME")
