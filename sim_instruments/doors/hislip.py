"""A HiSLIP door (IVI-6.1, synchronized mode): what pyvisa-py opens as ``TCPIP::host::hislip0,port::INSTR``.

Message types and control codes after IVI-6.1 revision 1.1 (from memory, and checked against pyvisa-py's
client). Overlap mode and encryption are refused in the handshake, as the standard allows.
"""

from __future__ import annotations

import contextlib
import itertools
import socket
import struct
import threading
from collections.abc import Iterator
from dataclasses import dataclass, field

from sim_instruments.doors.frames import FATAL, MINOR, Frame, Kind, receive_frame, send_frame
from sim_instruments.doors.stream import StreamDoor, quick
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.line import Line

__all__ = ["HislipDoor"]

_VERSION = 0x0100
_VENDOR = 0x5349  # "SI"
_PAYLOAD = 1 << 20
"""Largest payload taken here in one message."""
_LOCK_SLICE_S = 0.05
_CATCH_UP_S = 0.25
"""How long a status query waits for messages sent before it on the other connection."""
_FIRST_MESSAGE = 0xFFFF_FF00


@dataclass
class _Client:
    """One client: two connections, one line."""

    number: int
    line: Line
    first: socket.socket
    second: socket.socket | None = None
    payload: int = 1 << 18
    unread: bool = False
    clearing: bool = False
    gone: threading.Event = field(default_factory=threading.Event)
    last: int = _FIRST_MESSAGE - 2
    moved: threading.Condition = field(default_factory=threading.Condition)

    def carried_out(self, message: int) -> None:
        """Note the last message number that was carried out."""
        with self.moved:
            self.last = message
            self.moved.notify_all()

    def wait_carried_out(self, message: int) -> None:
        """Wait for a message sent before on the other connection; clients give its number or the next."""
        near = (message, (message - 2) & 0xFFFF_FFFF)
        with self.moved:
            self.moved.wait_for(lambda: self.last in near, _CATCH_UP_S)


class _Fault(Exception):
    """The client broke the protocol: told by name, then hung up."""

    def __init__(self, code: int, what: str) -> None:
        super().__init__(code, what)
        self.code, self.what = code, what


@contextlib.contextmanager
def _faults_told(connection: socket.socket) -> Iterator[None]:
    """Tell the client by name what ends its connection."""
    try:
        yield
    except (_Fault, ValueError) as error:
        fault = error if isinstance(error, _Fault) else _Fault(1, str(error))
        text = f"{FATAL[fault.code]}: {fault.what}".encode()
        with contextlib.suppress(OSError):
            send_frame(connection, Kind.FATAL_ERROR, fault.code, 0, text)


class HislipDoor(StreamDoor):
    """Serves one instrument by HiSLIP on a TCP port.

    Parameters
    ----------
    instrument
        What answers.
    host, port
        Where; port 0 takes a free one.
    tell_interrupted
        Announce a lost response on the second connection, too. The standard asks for it, but a client that
        waits for another message there stumbles over it (pyvisa-py does), and message numbers tell it anyway.
    """

    def __init__(
        self, instrument: Instrument, host: str = "127.0.0.1", port: int = 0, tell_interrupted: bool = False
    ) -> None:
        super().__init__(host, port)
        self.instrument = instrument
        self.tell_interrupted = tell_interrupted
        self._clients: dict[int, _Client] = {}
        self._numbers = itertools.count(1)

    @property
    def resource(self) -> str:
        """VISA resource name."""
        return f"TCPIP0::{self.host}::hislip0,{self.port}::INSTR"

    def converse(self, connection: socket.socket) -> None:
        """Serve one connection, whichever of the two it is."""
        with _faults_told(connection):
            opening = receive_frame(connection, _PAYLOAD)
            if opening.kind == Kind.INITIALIZE:
                self._first(connection, opening)
            elif opening.kind == Kind.ASYNC_INITIALIZE:
                self._second(connection, opening)
            else:
                raise _Fault(3, f"a client begins with Initialize, not with message type {opening.kind}")

    # -- the first connection: messages -------------------------------------------------------------------

    def _first(self, connection: socket.socket, opening: Frame) -> None:
        name = opening.payload.decode("latin-1")
        if name.lower() not in ("", "hislip0"):
            raise _Fault(3, f"there is no {name[:40]!r} here, only hislip0")
        client = _Client(next(self._numbers) & 0xFFFF, self.instrument.line(), connection)
        self._clients[client.number] = client
        send_frame(connection, Kind.INITIALIZE_RESPONSE, 0, _VERSION << 16 | client.number)  # 0: no overlap
        try:
            with _faults_told(connection):
                while not self.instrument.line_closed:
                    quick(connection)
                    self._message(client, receive_frame(connection, _PAYLOAD))
        finally:
            del self._clients[client.number]
            client.gone.set()
            self.instrument.locks.leave(self._key(client))
            for other in (connection, client.second):
                if other is not None:
                    with contextlib.suppress(OSError):
                        other.shutdown(socket.SHUT_RDWR)

    def _message(self, client: _Client, frame: Frame) -> None:
        if client.second is None:
            raise _Fault(2, "the second connection is not there yet")
        if frame.too_large:
            what = f"{MINOR[4]}: at most {_PAYLOAD} bytes".encode()
            send_frame(client.first, Kind.ERROR, 4, 0, what)
        elif frame.kind in (Kind.DATA, Kind.DATA_END, Kind.TRIGGER):
            if client.clearing:  # on its way when the client asked to clear
                return
            while not self.instrument.locks.wait_admitted(self._key(client), _LOCK_SLICE_S):
                if client.gone.is_set():
                    return
            self._exchange(client, frame)
        elif frame.kind == Kind.DEVICE_CLEAR_COMPLETE:
            client.line.clear()
            client.clearing = client.unread = False
            client.carried_out(_FIRST_MESSAGE - 2)
            send_frame(client.first, Kind.DEVICE_CLEAR_ACKNOWLEDGE, 0, 0)
        elif frame.kind == Kind.ERROR:
            return  # the client tells of a mistake; there is nothing to mend
        elif frame.kind == Kind.FATAL_ERROR:
            raise ConnectionError(frame.payload.decode("latin-1"))
        else:
            self._unknown(client.first, frame)

    def _exchange(self, client: _Client, frame: Frame) -> None:
        line = client.line
        with self.instrument.world.lock:
            if frame.control & 1:  # the client has read the last response to its end
                client.unread = False
            if client.unread:
                line.interrupted()
                client.unread = False
                send_frame(client.first, Kind.INTERRUPTED, 0, frame.parameter)
                if self.tell_interrupted and client.second is not None:
                    send_frame(client.second, Kind.ASYNC_INTERRUPTED, 0, frame.parameter)
            if frame.kind == Kind.TRIGGER:
                self.instrument.group_trigger()
            else:
                line.receive(frame.payload, frame.kind == Kind.DATA_END)
            line.proceed()
            response, _ = line.take(1 << 62) if line.has_output else (b"", True)
            client.unread = bool(response)
        client.carried_out(frame.parameter)
        if response:
            self._respond(client, response, frame.parameter)

    @staticmethod
    def _respond(client: _Client, response: bytes, message: int) -> None:
        view = memoryview(response)
        while len(view) > client.payload:
            send_frame(client.first, Kind.DATA, 0, message, view[: client.payload])
            view = view[client.payload :]
        send_frame(client.first, Kind.DATA_END, 0, message, view)

    # -- the second connection: everything out of turn ------------------------------------------------------

    def _second(self, connection: socket.socket, opening: Frame) -> None:
        client = self._clients.get(opening.parameter & 0xFFFF)
        if client is None or client.second is not None:
            raise _Fault(3, f"no client {opening.parameter} waits for its second connection")
        client.second = connection
        send_frame(connection, Kind.ASYNC_INITIALIZE_RESPONSE, 0, _VENDOR)
        try:
            with _faults_told(connection):
                while not client.gone.is_set():
                    self._out_of_turn(client, connection, receive_frame(connection, _PAYLOAD))
        finally:
            with contextlib.suppress(OSError):
                client.first.shutdown(socket.SHUT_RDWR)

    def _out_of_turn(self, client: _Client, connection: socket.socket, frame: Frame) -> None:
        if frame.kind == Kind.ASYNC_MAXIMUM_MESSAGE_SIZE:
            if len(frame.payload) != 8:
                raise _Fault(1, f"a message size in {len(frame.payload)} bytes, where 8 are due")
            wanted = int(struct.unpack("!Q", frame.payload)[0])
            client.payload = min(max(wanted, 64), _PAYLOAD)
            size = struct.pack("!Q", _PAYLOAD)
            send_frame(connection, Kind.ASYNC_MAXIMUM_MESSAGE_SIZE_RESPONSE, 0, 0, size)
        elif frame.kind == Kind.ASYNC_STATUS_QUERY:
            client.wait_carried_out(frame.parameter)
            if frame.control & 1:
                client.unread = False
            with self.instrument.world.lock:
                self.instrument.asked()
                byte = self.instrument.status_byte(client.unread)
            send_frame(connection, Kind.ASYNC_STATUS_RESPONSE, byte, 0)
        elif frame.kind == Kind.ASYNC_DEVICE_CLEAR:
            client.clearing = True
            send_frame(connection, Kind.ASYNC_DEVICE_CLEAR_ACKNOWLEDGE, 0, 0)
        elif frame.kind == Kind.ASYNC_LOCK:
            send_frame(connection, Kind.ASYNC_LOCK_RESPONSE, self._lock(client, frame), 0)
        elif frame.kind == Kind.ASYNC_LOCK_INFO:
            locks = self.instrument.locks
            send_frame(connection, Kind.ASYNC_LOCK_INFO_RESPONSE, int(locks.exclusive), locks.holders)
        elif frame.kind == Kind.ASYNC_REMOTE_LOCAL_CONTROL:  # there is no front panel to lock
            send_frame(connection, Kind.ASYNC_REMOTE_LOCAL_RESPONSE, 0, 0)
        elif frame.kind == Kind.FATAL_ERROR:
            raise ConnectionError(frame.payload.decode("latin-1"))
        elif frame.kind != Kind.ERROR:
            self._unknown(connection, frame)

    def _lock(self, client: _Client, frame: Frame) -> int:
        """0 failed, 1 done (exclusive), 2 a shared lock released, 3 not possible."""
        locks, key = self.instrument.locks, self._key(client)
        if frame.control == 0:
            return {"exclusive": 1, "shared": 2, "": 3}[locks.release(key)]
        name = frame.payload.decode("latin-1")
        if frame.control != 1 or locks.holds(key, name):
            return 3
        return int(locks.acquire(key, name, frame.parameter / 1000.0))

    @staticmethod
    def _unknown(connection: socket.socket, frame: Frame) -> None:
        what = f"{MINOR[1]}: {frame.kind}".encode()
        send_frame(connection, Kind.ERROR, 1, 0, what)

    def _key(self, client: _Client) -> tuple[int, int]:
        return id(self), client.number
