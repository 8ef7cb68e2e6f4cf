"""Opening a conversation by VISA resource name."""

from __future__ import annotations

from typing import Any

import pyvisa

from benchrun.clock import Clock
from benchrun.errors import ResourceNotFound
from benchrun.scpi.faults import translate
from benchrun.scpi.session import Session
from benchrun.scpi.transcript import Transcript

__all__ = ["open_manager", "open_session"]


def open_manager(library: Any) -> pyvisa.ResourceManager:
    """A resource manager of a VISA library.

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
            f"there is no VISA library {library or 'of the system'} on this machine ({str(error).splitlines()[0]}); "
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
    except (pyvisa.errors.Error, ValueError, AttributeError, KeyError, TypeError) as error:
        raise ResourceNotFound(
            f"cannot be opened: {error}; check the resource name in the bench file", resource=resource
        ) from error
    if not isinstance(line, pyvisa.resources.MessageBasedResource):
        line.close()
        raise ResourceNotFound("is no instrument that takes messages", resource=resource)
    return Session(line, clock, transcript)
