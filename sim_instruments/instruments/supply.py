"""A DC supply with one output, wired to whatever active part is connected.

It understands, beside the common commands, ``SYSTem`` and ``STATus`` (brackets: may be left out)::

    [SOURce]:VOLTage[:LEVel][:IMMediate][:AMPLitude] <V>|MIN|MAX|DEF
    [SOURce]:CURRent[:LEVel][:IMMediate][:AMPLitude] <A>|MIN|MAX|DEF     the limit
    [SOURce]:CURRent:PROTection:STATe ON|OFF        trip at the limit instead of holding the current there
    [SOURce]:CURRent:PROTection:TRIPped?            1 after a trip
    [SOURce]:CURRent:PROTection:CLEar
    OUTPut[:STATe] ON|OFF|1|0
    MEASure[:SCALar]:VOLTage[:DC]?                  MEASure[:SCALar]:CURRent[:DC]?

each setting with its query. Bit 1 (current) of STATus:QUEStionable: tripped, or holding the current; bit 0
(voltage): the output is below what was set. A trip switches the output off.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import Settings, allowed, chosen, limit
from sim_instruments.parts.base import Stage
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.tree import Command
from sim_instruments.values import number

__all__ = ["Supply"]

_VOLT = {"V": 1.0, "MV": 1e-3}
_AMPERE = {"A": 1.0, "MA": 1e-3}
_VOLTAGE, _CURRENT = 0, 1
"""Bits of the QUEStionable register."""
_MEASURING_S = 0.02


class Supply(Instrument):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands; from now on nothing active works there without it.
    identity
        Four fields of ``*IDN?``.
    spec
        ``limits``: ``voltage``, ``current``; ``voltage error``, ``current error`` (relative, one standard
        deviation); ``noise`` of a measurement (V, and A for one ohm); ``lead`` (ohm, there and back);
        ``manners``: ``beyond limits``: refuse or nearest, ``numbers``: plain or scientific.
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
        allowed(
            "a supply", spec, "kind", "model", "serial", "limits", "manners", "voltage error",
            "current error", "noise", "lead",
        )  # fmt: skip
        allowed("limits", spec.get("limits", {}), "voltage", "current")
        self._wired = world
        self._ends_v, self._ends_a = limit(spec, "voltage", 0.0, 30.0), limit(spec, "current", 0.0, 3.0)
        self._scale_v = 1 + draws.normal("voltage", number(spec.get("voltage error", 2e-4)))
        self._scale_a = 1 + draws.normal("current", number(spec.get("current error", 1e-3)))
        self._noise, self._lead_ohm = number(spec.get("noise", 2e-4)), number(spec.get("lead", 0.05))
        self._generator = draws.generator("noise")
        if world.supply is not None:
            raise ValueError("another supply feeds this bench already")
        world.supply = self.volts
        manners = spec.get("manners", {})
        allowed("manners", manners, "beyond limits", "numbers")
        self.reset()
        settings = Settings(
            self, nearest=chosen("manners", manners, "beyond limits", "refuse", "nearest") == "nearest",
            scientific=chosen("manners", manners, "numbers", "plain", "scientific") == "scientific",
        )  # fmt: skip
        self._settings, add = settings, self.tree.add
        tail = "[:LEVel][:IMMediate][:AMPLitude]"
        add(f"[SOURce]:VOLTage{tail}", settings.number("voltage", self._ends_v, _VOLT))
        add(f"[SOURce]:CURRent{tail}", settings.number("current", self._ends_a, _AMPERE))
        add("[SOURce]:CURRent:PROTection:STATe", settings.switch("protected"))
        add("[SOURce]:CURRent:PROTection:TRIPped", Command(get=lambda _: str(int(self.tripped))))
        add("[SOURce]:CURRent:PROTection:CLEar", Command(lambda _: self._clear_trip()))
        add("OUTPut[:STATe]", settings.switch("output", self._switch))
        add("MEASure[:SCALar]:VOLTage[:DC]", Command(get=lambda _: self._measured(0)))
        add("MEASure[:SCALar]:CURRent[:DC]", Command(get=lambda _: self._measured(1)))

    def reset(self) -> None:
        """Output off at 0 V, the limit at its lowest tenth, protection off."""
        self.voltage, self.output, self.tripped, self.protected = self._ends_v[0], False, False, False
        self.current = self._ends_a[0] + 0.1 * (self._ends_a[1] - self._ends_a[0])
        self.refresh()

    def refresh(self) -> None:
        """Let the load draw what it draws, and trip if that is too much."""
        self.volts()
        super().refresh()

    def volts(self) -> float:
        """Volts at the load now; trips if that is due."""
        volts, amperes = self.now()
        held = self.output and amperes >= self.current * (1 - 1e-9)
        if held and self.protected:
            self.output, self.tripped = False, True
            volts = 0.0
        self.status.questionable.put(_CURRENT, self.tripped or (held and self.output))
        self.status.questionable.put(_VOLTAGE, self.output and held)
        return volts

    # -- physics -----------------------------------------------------------------------------------------

    def now(self) -> tuple[float, float]:
        """True volts at the load, and amperes: in full if the load takes less than the limit."""
        if not self.output:
            return 0.0, 0.0
        with self._wired.lock:
            stages = [part.stage for part in self._wired.connected_parts() if part.stage is not None]
        set_v = self.voltage * self._scale_v
        volts = _settle(stages, lambda v: v + self._lead_ohm * _drawn(stages, v) - set_v, set_v)
        if _drawn(stages, volts) > self.current:
            volts = _settle(stages, lambda v: _drawn(stages, v) - self.current, volts)
            return volts, self.current
        return volts, _drawn(stages, volts)

    def _measured(self, which: int) -> str:
        self.world.advance(_MEASURING_S)
        self.refresh()
        value = self.now()[which] * (self._scale_v, self._scale_a)[which]
        return self._settings.words(value + self._noise * float(self._generator.standard_normal()) * 0.5)

    # -- commands ----------------------------------------------------------------------------------------

    def _switch(self, on: bool) -> None:
        if on and self.tripped:
            raise ScpiError(-221, "the current protection has tripped")
        self.output = on
        self.refresh()

    def _clear_trip(self) -> None:
        self.tripped = False
        self.refresh()


def _drawn(stages: list[Stage], volts: float) -> float:
    return float(np.sum([stage.current_a(volts) for stage in stages]))


def _settle(stages: list[Stage], error: Any, high: float) -> float:
    """Voltage between 0 and ``high`` at which a rising function is zero, by halving."""
    if not stages or error(high) <= 0:
        return high
    low = 0.0
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if error(middle) < 0 else (low, middle)
    return low
