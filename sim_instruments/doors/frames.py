"""HiSLIP messages on the wire: a header of sixteen bytes and a payload (IVI-6.1, 2.4, from memory)."""

from __future__ import annotations

import enum
import socket
import struct
from dataclasses import dataclass

from sim_instruments.doors.stream import receive_exactly

__all__ = ["FATAL", "MINOR", "Frame", "Kind", "receive_frame", "send_frame"]

_HEADER = struct.Struct("!2sBBIQ")
FATAL = {
    0: "Unidentified error",
    1: "Poorly formed message header",
    2: "Attempt to use connection without both channels established",
    3: "Invalid Initialization sequence",
    4: "Server refused connection due to maximum number of clients exceeded",
}
"""After which the connection ends."""
MINOR = {
    0: "Unidentified error",
    1: "Unrecognized Message Type",
    2: "Unrecognized control code",
    3: "Unrecognized Vendor Defined Message",
    4: "Message too large",
}
"""After which it goes on."""


class Kind(enum.IntEnum):
    """Message types."""

    INITIALIZE = 0
    INITIALIZE_RESPONSE = 1
    FATAL_ERROR = 2
    ERROR = 3
    ASYNC_LOCK = 4
    ASYNC_LOCK_RESPONSE = 5
    DATA = 6
    DATA_END = 7
    DEVICE_CLEAR_COMPLETE = 8
    DEVICE_CLEAR_ACKNOWLEDGE = 9
    ASYNC_REMOTE_LOCAL_CONTROL = 10
    ASYNC_REMOTE_LOCAL_RESPONSE = 11
    TRIGGER = 12
    INTERRUPTED = 13
    ASYNC_INTERRUPTED = 14
    ASYNC_MAXIMUM_MESSAGE_SIZE = 15
    ASYNC_MAXIMUM_MESSAGE_SIZE_RESPONSE = 16
    ASYNC_INITIALIZE = 17
    ASYNC_INITIALIZE_RESPONSE = 18
    ASYNC_DEVICE_CLEAR = 19
    ASYNC_SERVICE_REQUEST = 20
    ASYNC_STATUS_QUERY = 21
    ASYNC_STATUS_RESPONSE = 22
    ASYNC_DEVICE_CLEAR_ACKNOWLEDGE = 23
    ASYNC_LOCK_INFO = 24
    ASYNC_LOCK_INFO_RESPONSE = 25


@dataclass(frozen=True)
class Frame:
    """One message.

    Parameters
    ----------
    kind
        Message type, one of :class:`Kind` if it is known.
    control, parameter
        As the type means them.
    payload
        Data; nothing where there was too much of it.
    too_large
        The payload was dropped.
    """

    kind: int
    control: int
    parameter: int
    payload: bytes = b""
    too_large: bool = False


def receive_frame(connection: socket.socket, most: int) -> Frame:
    """The next message.

    Parameters
    ----------
    most
        Largest payload to take; a larger one is read and dropped.

    Raises
    ------
    ValueError
        If it does not begin as a message does.
    ConnectionError
        If the other side has gone.
    """
    prologue, kind, control, parameter, size = _HEADER.unpack(receive_exactly(connection, _HEADER.size))
    if prologue != b"HS":
        raise ValueError(f"a message begins with 'HS', not with {prologue!r}")
    if size <= most:
        return Frame(kind, control, parameter, receive_exactly(connection, size) if size else b"")
    while size:
        size -= len(receive_exactly(connection, min(size, 1 << 16)))
    return Frame(kind, control, parameter, b"", too_large=True)


def send_frame(
    connection: socket.socket, kind: Kind, control: int, parameter: int, payload: bytes | memoryview = b""
) -> None:
    """Send one message."""
    header = _HEADER.pack(b"HS", kind, control, parameter, len(payload))
    if len(payload) < 1 << 14:
        connection.sendall(header + bytes(payload))
    else:  # spares copying what is long
        connection.sendall(header)
        connection.sendall(payload)
