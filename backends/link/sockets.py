"""Addresses and ZeroMQ sockets of the link: bounded, never lingering, and plain only where that is allowed."""

from __future__ import annotations

import ipaddress
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import cast

import zmq

from backends.contract import BackendError
from backends.link.messages import FRAME_BYTES_MOST

FRAMES_QUEUED_MOST = 64
"""Frames a socket holds for a peer that does not take them. More are dropped: what matters is sent again."""
ADMISSION = "trundle"
"""The ZAP domain; naming one makes a socket refuse everybody where nobody checks keys."""

NOW = int(zmq.NOBLOCK)
AND_MORE = int(zmq.NOBLOCK | zmq.SNDMORE)
"""Flags as plain numbers: to put two of the library's together costs as much as to send a frame."""
_INCOMING = int(zmq.POLLIN)

_TCP = re.compile(r"tcp://(?P<host>\[[0-9A-Fa-f:.]+\]|[0-9A-Za-z.-]+):(?P<port>\d{1,5})\Z")
IPC_PATH_MOST = 100


@dataclass(frozen=True, slots=True)
class Keys:
    """Our own pair, and on a controller's side the public key of the robot. Z85 text."""

    secret: bytes
    public: bytes
    robot: bytes = b""

    def __repr__(self) -> str:
        return f"Keys(public={self.public!r})"


def check_address(address: str) -> None:
    """BackendError, with what an address looks like, where this is none."""
    if address.startswith("ipc://"):
        if not 0 < len(address.removeprefix("ipc://").encode()) <= IPC_PATH_MOST:
            raise BackendError(f"The path of an ipc address has 1 to {IPC_PATH_MOST} bytes: {address}")
        return
    found = _TCP.match(address)
    if found is None or not 0 < int(found["port"]) < 65_536:
        raise BackendError(f'"{address}" is no address. Write tcp://HOST:PORT or ipc:///PATH.')


def on_this_computer(address: str) -> bool:
    """Whether an address leads nowhere beyond this computer."""
    if address.startswith("ipc://"):
        return True
    found = _TCP.match(address)
    host = found["host"].strip("[]") if found else ""
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return False


def check_line(address: str, has_keys: bool, insecure: bool) -> None:
    """BackendError for an address that is none, and for plain text beyond this computer that nobody asked for."""
    check_address(address)
    if not has_keys and not insecure and not on_this_computer(address):
        raise BackendError(
            f"Without keys everybody on the way to {address} could drive the robot. "
            "Make keys with `trundle link keys`, or say --insecure-line if that is what you want."
        )


def controller_socket(context: zmq.Context[zmq.Socket[bytes]], address: str, keys: Keys | None) -> zmq.Socket[bytes]:
    """A connected socket. Nothing is queued for a robot that is not there."""
    socket = context.socket(zmq.DEALER)
    _bound(socket)
    socket.setsockopt(zmq.IMMEDIATE, 1)
    socket.setsockopt(zmq.RECONNECT_IVL, 100)
    socket.setsockopt(zmq.RECONNECT_IVL_MAX, 1000)
    socket.setsockopt(zmq.CONNECT_TIMEOUT, 3000)
    if keys is not None:
        socket.curve_secretkey, socket.curve_publickey = keys.secret, keys.public
        socket.curve_serverkey = keys.robot
    socket.connect(address)
    return socket


def robot_socket(context: zmq.Context[zmq.Socket[bytes]], address: str, keys: Keys | None) -> zmq.Socket[bytes]:
    """A bound socket. BackendError where the address is not to be had."""
    socket = context.socket(zmq.ROUTER)
    _bound(socket)
    if keys is not None:
        socket.curve_server = True
        socket.curve_secretkey = keys.secret
        socket.zap_domain = ADMISSION.encode()
        socket.setsockopt(zmq.ZAP_ENFORCE_DOMAIN, 1)
    try:
        socket.bind(address)
    except zmq.ZMQError as error:
        socket.close()
        raise BackendError(f"{address} cannot be listened on: {error.strerror}.") from None
    return socket


def frame_waits(socket: zmq.Socket[bytes]) -> bool:
    """Whether a frame can be taken without waiting. Cheaper than trying: an exception costs more than a frame."""
    return bool(wait_for_frames((socket,), 0))


def wait_for_frames(sockets: Sequence[zmq.Socket[bytes]], milliseconds: int) -> list[zmq.Socket[bytes]]:
    """Those of the sockets that have a frame, as soon as one has; none where that took too long."""
    found = zmq.zmq_poll([(socket, _INCOMING) for socket in sockets], milliseconds)
    return [cast("zmq.Socket[bytes]", socket) for socket, _ in found]


def _bound(socket: zmq.Socket[bytes]) -> None:
    socket.setsockopt(zmq.LINGER, 0)
    socket.setsockopt(zmq.SNDHWM, FRAMES_QUEUED_MOST)
    socket.setsockopt(zmq.RCVHWM, 4 * FRAMES_QUEUED_MOST)
    socket.setsockopt(zmq.MAXMSGSIZE, FRAME_BYTES_MOST)
    socket.setsockopt(zmq.HEARTBEAT_IVL, 2000)
    socket.setsockopt(zmq.HEARTBEAT_TIMEOUT, 6000)
    socket.setsockopt(zmq.HANDSHAKE_IVL, 5000)
    if hasattr(zmq, "IPV6"):
        socket.setsockopt(zmq.IPV6, 1)
