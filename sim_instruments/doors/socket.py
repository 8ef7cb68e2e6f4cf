"""A raw TCP door: one instrument, one port, messages ended by LF."""

from __future__ import annotations

import contextlib
import socket
import socketserver
import threading
from types import TracebackType

from sim_instruments.scpi.instrument import Instrument

__all__ = ["SocketDoor"]


class _Handler(socketserver.BaseRequestHandler):
    server: _Server

    def handle(self) -> None:
        line: socket.socket = self.request
        line.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        quick = getattr(socket, "TCP_QUICKACK", None)
        instrument = self.server.instrument
        with contextlib.suppress(OSError):
            while not instrument.line_closed:
                if quick is not None:  # or a client without NODELAY waits 40 ms for every second message
                    line.setsockopt(socket.IPPROTO_TCP, quick, 1)
                data = line.recv(1 << 16)
                if not data:
                    return
                instrument.receive(data)
                answer, _ = instrument.take(1 << 30)
                if answer:
                    line.sendall(answer)


class _Server(socketserver.ThreadingTCPServer):
    allow_reuse_address = True
    daemon_threads = True

    def __init__(self, address: tuple[str, int], instrument: Instrument) -> None:
        self.instrument = instrument
        super().__init__(address, _Handler)


class SocketDoor:
    """Serves one instrument on a TCP port of the loopback interface.

    Parameters
    ----------
    instrument
        What answers.
    host, port
        Where; port 0 takes a free one.

    Examples
    --------
    >>> from sim_instruments.bench import load_bench
    >>> bench = load_bench("workshop", 1)
    >>> with SocketDoor(bench.instruments["GPIB0::16::INSTR"]) as door:
    ...     door.resource.startswith("TCPIP0::127.0.0.1::")
    True
    """

    def __init__(self, instrument: Instrument, host: str = "127.0.0.1", port: int = 0) -> None:
        self._server = _Server((host, port), instrument)
        self._thread = threading.Thread(target=self._server.serve_forever, args=(0.01,), daemon=True)

    @property
    def port(self) -> int:
        """The port in use."""
        return int(self._server.server_address[1])

    @property
    def resource(self) -> str:
        """VISA resource name."""
        return f"TCPIP0::{self._server.server_address[0]!s}::{self.port}::SOCKET"

    def __enter__(self) -> SocketDoor:
        self._thread.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._server.shutdown()
        self._server.server_close()
