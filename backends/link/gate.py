"""Who is admitted: the ZAP handler (ZeroMQ RFC 27) of one robot, in the thread that serves it.

A key that is not on the list gets no connection, no answer and no log line of its own; it is counted. The library's
authenticator would do, but runs in a thread of its own and does not count.
"""

from __future__ import annotations

import zmq
import zmq.utils.z85

from backends.link.sockets import ADMISSION, frame_waits

ZAP_ADDRESS = "inproc://zeromq.zap.01"


class Gate:
    """Checks keys against a list of them. `names` says whose they are."""

    def __init__(self, context: zmq.Context[zmq.Socket[bytes]], names: dict[bytes, str]) -> None:
        self.names = names
        self.admitted = 0
        self.refused = 0
        self.socket = context.socket(zmq.REP)
        self.socket.setsockopt(zmq.LINGER, 0)
        self.socket.bind(ZAP_ADDRESS)

    @property
    def asked(self) -> bool:
        """Whether a request waits."""
        return frame_waits(self.socket)

    def turn(self) -> None:
        """Answer the requests that wait."""
        while self.asked:
            self.socket.send_multipart(self._answer(self.socket.recv_multipart()))

    def _answer(self, request: list[bytes]) -> list[bytes]:
        version, number, domain, _, _, mechanism = (*request[:6], *[b""] * (6 - len(request[:6])))
        key = zmq.utils.z85.encode(request[6]) if len(request) == 7 and len(request[6]) == 32 else b""
        if mechanism == b"CURVE" and domain == ADMISSION.encode() and key in self.names:
            self.admitted += 1
            return [version, number, b"200", b"", key, b""]
        self.refused += 1
        return [version, number, b"400", b"", b"", b""]

    def close(self) -> None:
        """Admit nobody any more."""
        self.socket.close()
