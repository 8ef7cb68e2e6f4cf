"""Opening a conversation by VISA resource name."""

from __future__ import annotations

import contextlib
import socket
from typing import Any

import pyvisa

from benchrun.clock import Clock
from benchrun.errors import ResourceNotFound
from benchrun.scpi.faults import first_line, is_dead, translate
from benchrun.scpi.session import Session
from benchrun.scpi.transcript import Transcript

__all__ = ["open_manager", "open_session"]


def open_manager(library: Any) -> pyvisa.ResourceManager:
    """Open a resource manager of a VISA library.

    Parameters
    ----------
    library
        Its name as PyVISA knows it (empty for the system's), or a library object.

    Raises
    ------
    ResourceNotFound
        If there is no such library on this machine.
    """
    try:
        return pyvisa.ResourceManager(library)
    except (OSError, ValueError) as error:
        raise ResourceNotFound(
            f"there is no VISA library {library or 'of the system'} on this machine "
            f"({first_line(error)}); "
            'install the one of your interface, or write library: "@py" in the bench file'
        ) from error


def open_session(
    manager: pyvisa.ResourceManager, resource: str, clock: Clock, transcript: Transcript
) -> Session:
    """Open one instrument.

    Raises
    ------
    ResourceNotFound, TransportError
        Naming the resource.
    """
    try:
        line = manager.open_resource(resource, open_timeout=3000)
    except (pyvisa.errors.VisaIOError, OSError, RuntimeError) as error:
        raise translate(error, resource, "open") from error
    except Exception as error:  # pyvisa-py raises bare ones where a host is unknown or does not answer
        raise ResourceNotFound(
            f"cannot be opened: {first_line(error)}; check the resource name in the bench file",
            resource=resource,
        ) from error
    if not isinstance(line, pyvisa.resources.MessageBasedResource):
        line.close()
        raise ResourceNotFound("is no instrument that takes messages", resource=resource)
    if is_dead(line):  # pyvisa-py opens a refused socket without complaint
        line.close()
        raise ResourceNotFound(
            "refuses the connection, or closed it at once; check address, port and power, and whether "
            "another program holds the instrument",
            resource=resource,
        )
    _send_at_once(line)
    return Session(line, clock, transcript)


def _send_at_once(line: Any) -> None:
    """Switch Nagle's waiting off, which costs 40 ms for each message after one that has no answer.

    PyVISA has an attribute for it that pyvisa-py does not know, so the socket itself is told.
    """
    with contextlib.suppress(AttributeError, KeyError, TypeError, OSError):
        line.visalib.sessions[line.session].interface.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
