"""Fakes at the seam that SCPI sessions talk through: a PyVISA resource, and a loopback TCP server."""

from __future__ import annotations

import contextlib
import socket
import threading
from collections.abc import Callable, Iterator
from typing import Any

import pytest
import pyvisa
from pyvisa.constants import ResourceAttribute, StatusCode
from pyvisa.errors import VisaIOError

from benchrun.clock import FunctionClock, SystemClock
from benchrun.scpi.opening import open_manager, open_session
from benchrun.scpi.session import Session
from benchrun.scpi.transcript import Transcript


class FakeResource:
    """A PyVISA resource made of one function: message -> reply bytes, an exception, or None for silence."""

    def __init__(
        self, answer: Callable[[str], Any], name: str = "GPIB0::16::INSTR", end: bool = True
    ) -> None:
        self.answer, self.resource_name, self.end = answer, name, end
        self.session, self.visalib = 7, self
        self.timeout = 0.0
        self.read_termination = self.write_termination = None
        self.termchar = True
        self.sent: list[str] = []
        self.timeouts: list[float] = []
        self.buffer = bytearray()
        self.clears = self.closes = 0
        self.clear_error: Exception | None = None
        self.on_read: Callable[[], None] = lambda: None

    def write(self, message: str) -> None:
        self.sent.append(message)
        reply = self.answer(message)
        if isinstance(reply, Exception):
            raise reply
        self.buffer += reply or b""

    def read(self, session: int, count: int) -> tuple[bytes, StatusCode]:
        assert session == self.session
        self.timeouts.append(self.timeout)
        self.on_read()
        if not self.buffer:
            raise VisaIOError(StatusCode.error_timeout)
        cut = self.buffer.find(b"\n") + 1 if self.termchar else 0
        size = min(count, len(self.buffer), cut or count)
        data = bytes(self.buffer[:size])
        del self.buffer[:size]
        if cut and size == cut:
            return data, StatusCode.success_termination_character_read
        if not self.buffer and self.end:
            return data, StatusCode.success
        if not self.buffer and size < count:
            raise VisaIOError(StatusCode.error_timeout)
        return data, StatusCode.success_max_count_read

    def set_visa_attribute(self, attribute: ResourceAttribute, value: bool) -> None:
        assert attribute == ResourceAttribute.termchar_enabled
        self.termchar = value

    @contextlib.contextmanager
    def ignore_warning(self, *codes: StatusCode) -> Iterator[None]:
        yield

    def clear(self) -> None:
        self.clears += 1
        if self.clear_error:
            raise self.clear_error
        self.buffer.clear()

    def close(self) -> None:
        self.closes += 1


class BenchTime:
    """Simulated seconds."""

    def __init__(self) -> None:
        self.now = 0.0

    def advance(self, seconds: float) -> None:
        self.now += seconds

    @property
    def clock(self) -> FunctionClock:
        return FunctionClock(lambda: self.now, self.advance)


@pytest.fixture
def bench_time() -> BenchTime:
    return BenchTime()


@pytest.fixture
def fake(bench_time: BenchTime) -> Callable[..., tuple[Session, FakeResource]]:
    """Make a session over a fake resource, in simulated time."""

    def make(answer: Callable[[str], Any] | dict[str, Any], **options: Any) -> tuple[Session, FakeResource]:
        function = answer.get if isinstance(answer, dict) else answer
        resource = FakeResource(function, **options)
        return Session(resource, bench_time.clock, Transcript()), resource

    return make


class Server:
    """A TCP server on loopback; each connection runs ``handler(connection)`` in one thread."""

    def __init__(self, handler: Callable[[socket.socket], None]) -> None:
        self._handler = handler
        self._listener = socket.create_server(("127.0.0.1", 0))
        self.port = self._listener.getsockname()[1]
        self.resource = f"TCPIP::127.0.0.1::{self.port}::SOCKET"
        self._connection: socket.socket | None = None
        self._thread = threading.Thread(target=self._run, daemon=True)
        self._thread.start()

    def _run(self) -> None:
        with contextlib.suppress(OSError):
            self._connection, _ = self._listener.accept()
            with self._connection:
                self._handler(self._connection)

    def stop(self) -> None:
        with contextlib.suppress(OSError):
            self._listener.shutdown(socket.SHUT_RDWR)
        self._listener.close()
        if self._connection is not None:
            with contextlib.suppress(OSError):
                self._connection.shutdown(socket.SHUT_RDWR)
            self._connection.close()
        self._thread.join(5.0)
        assert not self._thread.is_alive()


def answering(answer: Callable[[str], bytes | None]) -> Callable[[socket.socket], None]:
    """Make a handler that answers each line; None closes the connection."""

    def handler(connection: socket.socket) -> None:
        with connection.makefile("rb") as lines:
            for line in lines:
                reply = answer(line.decode("ascii").rstrip("\n"))
                if reply is None:
                    return
                connection.sendall(reply)

    return handler


@pytest.fixture
def tcp() -> Iterator[Callable[..., Session]]:
    """Open a session through pyvisa-py to a server with a handler, or with an answer per line."""
    servers: list[Server] = []
    sessions: list[Session] = []
    manager = open_manager("@py")

    def start(handler: Callable[[socket.socket], None] | None = None, **lines: Any) -> Session:
        server = Server(handler or answering(lines["answer"]))
        servers.append(server)
        session = open_session(manager, server.resource, SystemClock(), Transcript())
        sessions.append(session)
        return session

    yield start
    for session in sessions:
        session.close()
    for server in servers:
        server.stop()
    manager.close()


@pytest.fixture
def py_manager() -> Iterator[pyvisa.ResourceManager]:
    """Open pyvisa-py."""
    manager = open_manager("@py")
    yield manager
    manager.close()
