"""What the TCP doors share: a server of one instrument on loopback, whose connections end with it."""

from __future__ import annotations

import contextlib
import socket
import socketserver
import threading
from types import TracebackType
from typing import TypeVar

__all__ = ["StreamDoor", "quick", "receive_exactly"]

_Door = TypeVar("_Door", bound="StreamDoor")
_QUICK = getattr(socket, "TCP_QUICKACK", None)
_POLL_S = 0.01


def quick(connection: socket.socket) -> None:
    """Acknowledge at once, or a client without NODELAY waits 40 ms for every second message."""
    if _QUICK is not None:
        connection.setsockopt(socket.IPPROTO_TCP, _QUICK, 1)


def receive_exactly(connection: socket.socket, size: int) -> bytes:
    """So many bytes.

    Raises
    ------
    ConnectionError
        If the other side has gone before.
    """
    data = bytearray(size)
    view = memoryview(data)
    while view:
        count = connection.recv_into(view)
        if not count:
            raise ConnectionError(f"the client has gone with {len(view)} of {size} bytes still to come")
        view = view[count:]
    return bytes(data)


class _Handler(socketserver.BaseRequestHandler):
    server: _Server

    def handle(self) -> None:
        connection: socket.socket = self.request
        connection.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        with contextlib.suppress(OSError):  # a client that vanishes is no fault of the door
            self.server.door.converse(connection)


class _Server(socketserver.ThreadingTCPServer):
    allow_reuse_address = True
    daemon_threads = True
    block_on_close = False

    def __init__(self, address: tuple[str, int], door: StreamDoor) -> None:
        self.door = door
        self._open: set[socket.socket] = set()
        super().__init__(address, _Handler)

    def process_request_thread(self, request: object, client_address: object) -> None:
        assert isinstance(request, socket.socket)
        self._open.add(request)
        try:
            super().process_request_thread(request, client_address)
        finally:
            self._open.discard(request)

    def hang_up(self) -> None:
        for connection in tuple(self._open):
            with contextlib.suppress(OSError):
                connection.shutdown(socket.SHUT_RDWR)


class StreamDoor:
    """A door on a TCP port; used as a context.

    Parameters
    ----------
    host, port
        Where; port 0 takes a free one.
    """

    def __init__(self, host: str = "127.0.0.1", port: int = 0) -> None:
        self._server = _Server((host, port), self)
        self._thread = threading.Thread(target=self._server.serve_forever, args=(_POLL_S,), daemon=True)

    def converse(self, connection: socket.socket) -> None:
        """Serve one connection until it ends."""
        raise NotImplementedError

    @property
    def host(self) -> str:
        """The address in use."""
        return str(self._server.server_address[0])

    @property
    def port(self) -> int:
        """The port in use."""
        return int(self._server.server_address[1])

    def hang_up(self) -> None:
        """End every connection; new ones are welcome."""
        self._server.hang_up()

    def __enter__(self: _Door) -> _Door:
        self._thread.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._server.shutdown()
        self._server.hang_up()
        self._server.server_close()
        self._thread.join(5.0)
