"""A simple instrument described in PyVISA-sim's own YAML, beside the others in one bench file.

Its ``device`` is a device of a PyVISA-sim definition (``dialogues``, ``properties``, ``channels``; see that
library's documentation), its headers in capitals. What is not found there is answered by the common commands,
``SYSTem`` and ``STATus`` of every instrument here, so that such a device has an error queue and goes through
every door too. Messages match in any case; compound messages work.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import allowed
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.message import Unit
from sim_instruments.scpi.tree import Command

__all__ = ["Canned"]

_UNKNOWN = b"\x00"
"""What the device is made to say when it understands nothing."""
_MANY = 64


class Canned(Instrument):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands; it knows nothing of it.
    identity
        Four fields of ``*IDN?``: its maker is ``SIMULATED`` whatever the definition says.
    spec
        ``device``: the definition.
    draws
        Not used: every specimen is the same.

    Raises
    ------
    ValueError
        If the definition makes no sense.
    """

    def __init__(
        self,
        world: WiredWorld,
        identity: tuple[str, str, str, str],
        spec: Mapping[str, Any],
        draws: Draws,
    ) -> None:
        super().__init__(world, identity)
        allowed("an instrument of PyVISA-sim", spec, "kind", "model", "serial", "device")
        self._definition = dict(spec["device"])
        allowed("its device", self._definition, "dialogues", "properties", "channels")
        self._settable = {
            str(p["setter"]["q"]).partition(" ")[0].upper()
            for p in (self._definition.get("properties") or {}).values()
            if "setter" in p
        }
        self.reset()

    def reset(self) -> None:
        """Properties as they were defined."""
        from pyvisa_sim.parser import get_device  # not needed by benches without such a device

        definition = {**self._definition, "delimiter": ""}
        try:
            self._device = get_device("device", definition, None, {})
        except Exception as error:  # the library raises bare ones
            raise ValueError(f"no device for PyVISA-sim: {str(error).splitlines()[0]}") from error
        self._device.add_error_handler(_UNKNOWN.decode())
        self._device.resource_name = (
            "GPIB0::1::INSTR"  # ends messages with LF; where it stands is not its affair
        )

    def find(self, unit: Unit, path: tuple[str, ...]) -> Command:
        """A command of every instrument, or whatever the device makes of the unit."""
        try:
            return super().find(unit, path)
        except ScpiError as error:
            if error.number != -113:
                raise
        words = unit.header if unit.common or unit.absolute else (*path, *unit.header)
        header = ":".join(words).upper() + ("?" if unit.query else "")

        def say(parameters: tuple[str, ...]) -> bytes:
            answer = self._answer(" ".join([header, ",".join(parameters)]).rstrip())
            if answer == _UNKNOWN:
                raise ScpiError(-222 if header in self._settable else -113, header[:60])
            return answer

        def put(parameters: tuple[str, ...]) -> None:
            say(parameters)

        return Command(put, say, 0, _MANY, 0, _MANY)

    def _answer(self, message: str) -> bytes:
        self._device.write(message.encode("latin-1") + b"\n")
        answer = bytearray()
        while True:
            data, ended = self._device.read()
            answer += data
            if ended or not data:
                return bytes(answer).removesuffix(b"\n")
