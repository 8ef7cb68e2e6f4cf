"""A VISA library made of a world: PyVISA's simulation back end with what it lacks.

Mended here: an unknown resource fails when it is opened; clearing, serial poll and trigger exist; a fault
in a model is reported instead of vanishing; an answer is read in pieces of any size at once; waiting for an
answer that does not come costs simulated time, not real; and two libraries share nothing.
"""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from typing import Any

from pyvisa import constants, errors, rname
from pyvisa.util import LibraryPath
from pyvisa_sim.highlevel import SimVisaLibrary
from pyvisa_sim.sessions.session import Session

from sim_instruments.scpi.instrument import Instrument
from sim_instruments.world import World

__all__ = ["SimulatedVisa", "simulated_visa"]

_S = constants.StatusCode
_A = constants.ResourceAttribute
_COUNT = itertools.count()


class SimulatedVisa(SimVisaLibrary):  # type: ignore[misc]  # the base has no types
    """Made by :func:`simulated_visa`."""

    world: World
    instruments: Mapping[str, Instrument]

    def _init(self) -> None:
        self.sessions: dict[int, Any] = {}
        self.instruments = {}

    def open(self, session: Any, resource_name: str, access_mode: Any = None, open_timeout: Any = 0) -> Any:
        """Open a resource; an unknown one is an error at once."""
        try:
            parsed = rname.parse_resource_name(resource_name)
        except rname.InvalidResourceName:
            return self.handle_return_value(session, _S.error_invalid_resource_name)
        instrument = self.instruments.get(str(parsed))
        if instrument is None:
            return self.handle_return_value(session, _S.error_resource_not_found)
        made = Session.get_session_class(parsed.interface_type_const, parsed.resource_class)(
            session, resource_name, parsed
        )
        made.device = instrument
        return self._register(made), _S.success

    def list_resources(self, session: Any, query: str = "?*::INSTR") -> tuple[str, ...]:
        """Names of the instruments."""
        return tuple(rname.filter(tuple(self.instruments), query))

    def write(self, session: Any, data: bytes) -> tuple[int, Any]:
        """Hand over a message."""
        device = self._device(session)
        if device.line_closed:
            return 0, self.handle_return_value(session, _S.error_connection_lost)
        device.receive(bytes(data))
        return len(data), self.handle_return_value(session, _S.success)

    def read(self, session: Any, count: int) -> tuple[bytes, Any]:
        """Take a piece of the answer."""
        device, attributes = self._device(session), self.sessions[session].attrs
        if device.line_closed:
            return b"", self.handle_return_value(session, _S.error_connection_lost)
        until = attributes.get(_A.termchar, 10) if attributes.get(_A.termchar_enabled) else None
        data, ended = device.take(count, until)
        if not data:
            device.unasked()
            self.world.advance(float(attributes.get(_A.timeout_value, 2000)) / 1000.0)
            return b"", self.handle_return_value(session, _S.error_timeout)
        if ended:
            return data, self.handle_return_value(session, _S.success)
        if until is not None and data[-1] == until:
            return data, self.handle_return_value(session, _S.success_termination_character_read)
        return data, self.handle_return_value(session, _S.success_max_count_read)

    def clear(self, session: Any) -> Any:
        """Device clear."""
        self._device(session).clear()
        return self.handle_return_value(session, _S.success)

    def read_stb(self, session: Any) -> tuple[int, Any]:
        """Serial poll."""
        return self._device(session).status_byte(), self.handle_return_value(session, _S.success)

    def assert_trigger(self, session: Any, protocol: Any) -> Any:
        """Group execute trigger: no instrument here waits for one."""
        return self.handle_return_value(session, _S.error_nonsupported_operation)

    def flush(self, session: Any, mask: Any) -> Any:
        """Nothing is buffered."""
        return self.handle_return_value(session, _S.success)

    def _device(self, session: Any) -> Instrument:
        try:
            device: Instrument = self.sessions[session].device
        except KeyError:
            raise errors.VisaIOError(_S.error_invalid_object) from None
        return device


def simulated_visa(world: World, instruments: Mapping[str, Instrument]) -> SimulatedVisa:
    """A VISA library for one world.

    Parameters
    ----------
    world
        Whose time waiting costs.
    instruments
        By VISA resource name, in any spelling that VISA allows.

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
    library.world = world
    library.instruments = {
        str(rname.parse_resource_name(name)): device for name, device in instruments.items()
    }
    return library
