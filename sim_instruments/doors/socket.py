"""A raw TCP door: one instrument, one port, messages ended by LF.

Each connection has a line of its own: what one client left half said is gone with it. A stream knows neither
END nor device clear, serial poll, trigger and locks, and answers follow one another as they are made.
"""

from __future__ import annotations

import socket

from sim_instruments.doors.stream import StreamDoor, quick
from sim_instruments.scpi.instrument import Instrument

__all__ = ["SocketDoor"]


class SocketDoor(StreamDoor):
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
        super().__init__(host, port)
        self.instrument = instrument

    @property
    def resource(self) -> str:
        """VISA resource name."""
        return f"TCPIP0::{self.host}::{self.port}::SOCKET"

    def converse(self, connection: socket.socket) -> None:
        """Serve one connection until it ends."""
        answers: list[bytes] = []
        line = self.instrument.line(answers.append)
        while not self.instrument.line_closed:
            quick(connection)
            data = connection.recv(1 << 16)
            if not data:
                return
            line.receive(data)
            line.proceed()
            if answers:
                response = b"".join(answers)
                answers.clear()
                # Outside the world's lock: a client that does not read holds up nobody else.
                connection.sendall(response)
