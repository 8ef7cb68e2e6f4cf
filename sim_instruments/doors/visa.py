"""A VISA library made of a world: PyVISA's simulation back end with what it lacks.

Mended here: an unknown resource fails when it is opened; clearing, serial poll and trigger exist; a fault
in a model is reported instead of vanishing; an answer is read in pieces of any size at once; waiting for an
answer that does not come costs simulated time, not real; and two libraries share nothing.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping
from typing import Any

from pyvisa import constants, errors, rname
from pyvisa.util import LibraryPath
from pyvisa_sim.highlevel import SimVisaLibrary
from pyvisa_sim.sessions.session import Session

from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.line import Line
from sim_instruments.world import World

__all__ = ["SimulatedVisa", "simulated_visa"]

_S = constants.StatusCode
_A = constants.ResourceAttribute
_M = constants.AccessModes
_COUNT = itertools.count()


class SimulatedVisa(SimVisaLibrary):  # type: ignore[misc]  # the base has no types
    """Made by :func:`simulated_visa`."""

    world: World
    instruments: Mapping[str, Instrument]
    patient: bool

    def _init(self) -> None:
        self.sessions: dict[int, Any] = {}
        self.instruments = {}
        self.patient = True
        self._bus_lines: dict[str, Line] = {}

    def open(
        self, session: Any, resource_name: str, access_mode: Any = _M.no_lock, open_timeout: Any = 0
    ) -> Any:
        """Open a resource; an unknown one is an error at once."""
        try:
            parsed = rname.parse_resource_name(resource_name)
        except rname.InvalidResourceName:
            return self.handle_return_value(session, _S.error_invalid_resource_name)
        name = str(parsed)
        instrument = self.instruments.get(name)
        if instrument is None or instrument.line_closed:
            return self.handle_return_value(session, _S.error_resource_not_found)
        made = Session.get_session_class(parsed.interface_type_const, parsed.resource_class)(
            session, resource_name, parsed
        )
        made.device = instrument
        made.ends = parsed.resource_class == "INSTR" and parsed.interface_type != "ASRL"
        if parsed.interface_type == "TCPIP":  # a connection of its own; on a bus all share one
            made.line = instrument.line()
        else:
            made.line = self._bus_lines.setdefault(name, instrument.line())
        number = self._register(made)
        if access_mode == _M.exclusive_lock and not instrument.locks.acquire(self._client(number)):
            del self.sessions[number]
            return self.handle_return_value(session, _S.error_resource_locked)
        return number, _S.success

    def close(self, session: Any) -> Any:
        """Close a session; what it had locked is free."""
        if session in self.sessions and hasattr(self.sessions[session], "device"):
            self.sessions[session].device.locks.leave(self._client(session))
        return super().close(session)

    def list_resources(self, session: Any, query: str = "?*::INSTR") -> tuple[str, ...]:
        """Names of the instruments."""
        return tuple(rname.filter(tuple(self.instruments), query))

    def write(self, session: Any, data: bytes) -> tuple[int, Any]:
        """Hand over a message; END goes with its last byte unless that was switched off."""
        opened = self._opened(session)
        if trouble := self._trouble(session):
            return 0, self.handle_return_value(session, trouble)
        end = opened.ends and bool(opened.attrs.get(_A.send_end_enabled, True))
        opened.line.receive(bytes(data), end)
        return len(data), self.handle_return_value(session, _S.success)

    def read(self, session: Any, count: int) -> tuple[bytes, Any]:
        """Take a piece of the answer; waiting for it costs simulated time and returns at once."""
        opened = self._opened(session)
        if trouble := self._trouble(session):
            return b"", self.handle_return_value(session, trouble)
        attributes, line = opened.attrs, opened.line
        until = attributes.get(_A.termchar, 10) if attributes.get(_A.termchar_enabled) else None
        wait_s = float(attributes.get(_A.timeout_value, 2000)) / 1000.0
        if not line.has_output:
            line.proceed(math.inf if self.patient else wait_s)
        if not line.has_output:
            line.unasked()
            if self.patient:  # otherwise the wait has passed already
                self.world.advance(wait_s)
            return b"", self.handle_return_value(session, _S.error_timeout)
        data, ended = line.take(count, until)
        if ended:
            return data, self.handle_return_value(session, _S.success)
        if until is not None and data[-1] == until:
            return data, self.handle_return_value(session, _S.success_termination_character_read)
        return data, self.handle_return_value(session, _S.success_max_count_read)

    def clear(self, session: Any) -> Any:
        """Device clear."""
        opened = self._opened(session)
        if trouble := self._trouble(session):
            return self.handle_return_value(session, trouble)
        opened.line.clear()
        return self.handle_return_value(session, _S.success)

    def read_stb(self, session: Any) -> tuple[int, Any]:
        """Serial poll."""
        opened = self._opened(session)
        if trouble := self._trouble(session):
            return 0, self.handle_return_value(session, trouble)
        return opened.line.status_byte(), self.handle_return_value(session, _S.success)

    def assert_trigger(self, session: Any, protocol: Any) -> Any:
        """Group execute trigger."""
        opened = self._opened(session)
        if trouble := self._trouble(session):
            return self.handle_return_value(session, trouble)
        opened.device.group_trigger()
        return self.handle_return_value(session, _S.success)

    def flush(self, session: Any, mask: Any) -> Any:
        """Nothing is buffered."""
        self._opened(session)
        return self.handle_return_value(session, _S.success)

    def lock(self, session: Any, lock_type: Any, timeout: Any, requested_key: Any = None) -> tuple[str, Any]:
        """Lock the instrument; nobody can let go while one thread waits, so that waiting is in vain."""
        opened, client = self._opened(session), self._client(session)
        shared = lock_type == _M.shared_lock
        key = str(requested_key or f"lock {session}") if shared else ""
        if opened.device.locks.acquire(client, key):
            return key, self.handle_return_value(session, _S.success)
        self.world.advance(float(timeout) / 1000.0)
        return "", self.handle_return_value(session, _S.error_resource_locked)

    def unlock(self, session: Any) -> Any:
        """Let go of the lock."""
        held = self._opened(session).device.locks.release(self._client(session))
        return self.handle_return_value(session, _S.success if held else _S.error_session_not_locked)

    def _trouble(self, session: Any) -> Any:
        """Why nothing can be said now, or None."""
        device: Instrument = self.sessions[session].device
        if device.line_closed:
            return _S.error_connection_lost
        return None if device.locks.admits(self._client(session)) else _S.error_resource_locked

    def _client(self, session: Any) -> tuple[int, int]:
        return id(self), int(session)

    def _opened(self, session: Any) -> Any:
        opened = self.sessions.get(session)
        if opened is None or not hasattr(opened, "device"):
            raise errors.VisaIOError(_S.error_invalid_object)
        return opened


def simulated_visa(
    world: World, instruments: Mapping[str, Instrument], patient: bool = True
) -> SimulatedVisa:
    """A VISA library for one world.

    Parameters
    ----------
    world
        Whose time waiting costs.
    instruments
        By VISA resource name, in any spelling that VISA allows.
    patient
        Wait for the end of a sweep whatever the client's timeout, because it passes in no time; otherwise a
        sweep longer than the timeout ends in a timeout, as on a real bench.

    Returns
    -------
    SimulatedVisa
        To be given to ``pyvisa.ResourceManager``.

    Examples
    --------
    >>> import pyvisa
    >>> from sim_instruments.bench import load_bench
    >>> bench = load_bench("workshop", 1)
    >>> manager = pyvisa.ResourceManager(simulated_visa(bench.world, bench.instruments))
    >>> manager.open_resource("GPIB0::16::INSTR").query("*IDN?").split(",")[0]
    'SIMULATED'
    """
    path = f"world-{next(_COUNT)}"  # PyVISA keeps libraries by path: two worlds must never share one
    library: SimulatedVisa = SimulatedVisa(LibraryPath(path))
    SimulatedVisa._registry.pop((SimulatedVisa, path), None)
    library.world, library.patient = world, patient
    library.instruments = {
        str(rname.parse_resource_name(name)): device for name, device in instruments.items()
    }
    return library
