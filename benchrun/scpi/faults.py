"""One table from what lower libraries raise to the few errors of this project."""

from __future__ import annotations

import socket
from typing import Any

from pyvisa import constants, errors

from benchrun.errors import ConnectionLost, DeadlineExceeded, FramingError, ResourceNotFound, TransportError

__all__ = ["CODES", "first_line", "is_dead", "translate"]

_S = constants.StatusCode
_NOT_FOUND = {
    _S.error_resource_not_found,
    _S.error_invalid_resource_name,
    _S.error_library_not_found,
    _S.error_interface_number_not_configured,
    _S.error_machine_not_available,
    _S.error_resource_locked,
    _S.error_no_permission,
}
_LOST = {
    _S.error_connection_lost,
    _S.error_io,
    _S.error_no_listeners,
    _S.error_not_cic,
    _S.error_system_error,
    _S.error_invalid_object,
    _S.error_session_not_locked,
    _S.error_closing_failed,
    _S.error_not_system_controller,
}
_FRAMING = {
    _S.error_serial_framing,
    _S.error_serial_overrun,
    _S.error_serial_parity,
    _S.error_output_protocol_violation,
    _S.error_input_protocol_violation,
    _S.error_raw_write_protocol_violation,
    _S.error_raw_read_protocol_violation,
    _S.error_bus_error,
    _S.error_invalid_format,
}

CODES: dict[int, type[TransportError]] = {
    **dict.fromkeys(_NOT_FOUND, ResourceNotFound),
    **dict.fromkeys(_LOST, ConnectionLost),
    **dict.fromkeys(_FRAMING, FramingError),
    _S.error_timeout: DeadlineExceeded,
    _S.error_abort: ConnectionLost,
}
"""By VISA status; every other error status is a :class:`TransportError`."""


def translate(
    error: Exception, resource: str, request: str, elapsed_s: float = 0.0, limit_s: float = 0.0
) -> TransportError:
    """Say what a lower error means here.

    Parameters
    ----------
    error
        ``VisaIOError``, ``OSError`` or ``RuntimeError`` (pyvisa-py raises bare ones when a socket dies).
    resource, request
        What was talked to, and what was asked.
    elapsed_s, limit_s
        For a deadline.
    """
    if isinstance(error, errors.VisaIOError):
        kind = CODES.get(error.error_code, TransportError)
        said = f"{error.abbreviation}: {error.description}"
    elif isinstance(error, TimeoutError):
        kind, said = DeadlineExceeded, str(error)
    elif isinstance(error, OSError):
        kind, said = ConnectionLost, error.strerror or type(error).__name__
    else:
        kind, said = ConnectionLost, str(error)
    if kind is DeadlineExceeded:
        message = (
            f"gave no whole answer within {limit_s:.3g} s; check its power, its cable and whether it is busy"
        )
        return DeadlineExceeded(
            message, resource=resource, request=request, elapsed_s=elapsed_s, limit_s=limit_s
        )
    advice = {
        ResourceNotFound: "check the resource name in the bench file, the cable and the power",
        ConnectionLost: "check the cable and the power, then run again",
    }.get(kind, "run again; if it stays, look at the transcript in the record")
    return kind(f"{said}; {advice}", resource=resource, request=request)


def first_line(error: Exception) -> str:
    """Give the first line of an error's text, or its kind where it has none."""
    return (str(error).splitlines() or [type(error).__name__])[0]


def is_dead(resource: Any) -> bool:
    """Tell a dead socket from a slow instrument, without taking anything from the line.

    PyVISA-py reports a closed TCP line as a plain timeout; peeking one byte tells. Other back ends have no
    such socket and are never called dead here.
    """
    try:
        line = resource.visalib.sessions[resource.session].interface
        if not isinstance(line, socket.socket):
            return False
        return line.recv(1, socket.MSG_PEEK | socket.MSG_DONTWAIT) == b""
    except (BlockingIOError, AttributeError, KeyError, TypeError):
        return False
    except OSError:
        return True
