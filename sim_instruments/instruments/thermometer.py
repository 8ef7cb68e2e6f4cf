"""A room thermometer.

It understands, beside the common commands, ``SYSTem`` and ``STATus`` (brackets: may be left out)::

    MEASure[:SCALar]:TEMPerature?      READ[:SCALar][:TEMPerature]?    FETCh[:SCALar][:TEMPerature]?
    UNIT:TEMPerature CEL|K|F           and its query

FETCh gives the last reading: -230 if there is none.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import allowed
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.parameters import choice
from sim_instruments.scpi.tree import Command
from sim_instruments.values import number

__all__ = ["Thermometer"]


class Thermometer(Instrument):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands.
    identity
        Four fields of ``*IDN?``.
    spec
        ``error`` (K, one standard deviation), ``resolution`` (K), ``reading`` (s).
    draws
        What makes this specimen.
    """

    def __init__(
        self,
        world: WiredWorld,
        identity: tuple[str, str, str, str],
        spec: Mapping[str, Any],
        draws: Draws,
    ) -> None:
        super().__init__(world, identity)
        allowed("a thermometer", spec, "kind", "model", "serial", "error", "resolution", "reading")
        self._error_k = draws.normal("error", number(spec.get("error", 0.1)))
        self._resolution_k = number(spec.get("resolution", 0.01))
        self._reading_s = number(spec.get("reading", 0.2))
        self.reset()
        for header in ("MEASure[:SCALar]:TEMPerature", "READ[:SCALar][:TEMPerature]"):
            self.tree.add(header, Command(get=lambda _: self._read()))
        self.tree.add("FETCh[:SCALar][:TEMPerature]", Command(get=lambda _: self._words()))
        self.tree.add("UNIT:TEMPerature", Command(self._set_unit, lambda _: self.unit, 1, 1))

    def reset(self) -> None:
        """Degrees Celsius, no reading."""
        self.unit, self.celsius = "CEL", None

    unit: str
    celsius: float | None

    def _set_unit(self, parameters: tuple[str, ...]) -> None:
        self.unit = choice(parameters[0], "CEL", "K", "F")

    def _read(self) -> str:
        self.world.advance(self._reading_s)
        seen = self.world.temperature() + self._error_k
        self.celsius = round(seen / self._resolution_k) * self._resolution_k
        return self._words()

    def _words(self) -> str:
        if self.celsius is None:
            raise ScpiError(-230)
        shown = {"CEL": self.celsius, "K": self.celsius + 273.15, "F": self.celsius * 1.8 + 32}[self.unit]
        return f"{shown:.9G}"
