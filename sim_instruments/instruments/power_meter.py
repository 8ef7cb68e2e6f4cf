"""A power meter with an averaging head: it reads all that arrives, whatever its frequency.

It understands, beside the common commands, ``SYSTem`` and ``STATus`` (brackets: may be left out)::

    [SENSe]:FREQuency[:CW] <Hz>|MIN|MAX|DEF        which calibration factor to use
    [SENSe]:AVERage:COUNt <n>
    CALibration:ZERO:AUTO ONCE                     zero: nothing may arrive meanwhile
    UNIT:POWer DBM|W
    INITiate..., ABORt, TRIGger...                 see the trigger commands of :mod:`.sweeping`
    FETCh[:SCALar][:POWer][:AC]?   READ[:SCALar][:POWer][:AC]?   MEASure[:SCALar]:POWer[:AC]?

each setting with its query. FETCh gives the last reading, READ initiates one, MEASure resets the averaging
first. Too much power: 9.91E+37 (not a number) and bit 3 of STATus:QUEStionable.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.instruments.outlets import match_of
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import Settings, allowed, chosen, limit
from sim_instruments.instruments.signals import KT0_MW_HZ, milliwatt
from sim_instruments.instruments.sweeping import Sweeping
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.parameters import FREQUENCY, choice
from sim_instruments.scpi.tree import Command
from sim_instruments.values import number
from sim_instruments.waves import Real

__all__ = ["PowerMeter"]

_POWER = 3
_BANDWIDTH_STEPS = 64


class PowerMeter(Sweeping):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands.
    identity
        Four fields of ``*IDN?``.
    spec
        ``ports``: its one outlet; ``match`` (return loss, dB); ``limits``: ``frequency``, ``power``;
        ``calibration``: dB by which the head falls off to the upper end of its range, ``calibration error``
        (dB, one standard deviation, of what the meter knows of that); ``zero`` (W, what it is off before
        zeroing), ``noise`` (W, of one reading); ``reading``: seconds of one; ``manners``: ``numbers``.
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
            "a power meter", spec, "kind", "model", "serial", "ports", "match", "limits", "calibration",
            "calibration error", "zero", "noise", "reading", "manners",
        )  # fmt: skip
        allowed("limits", spec.get("limits", {}), "frequency", "power")
        manners = spec.get("manners", {})
        allowed("manners", manners, "numbers")
        self.wired, self.port = world, int(spec["ports"][0])
        self._ends_hz, self._ends_dbm = limit(spec, "frequency", 1e6, 6e9), limit(spec, "power", -30.0, 20.0)
        self._falls_db = number(spec.get("calibration", 0.4))
        self._error_db = draws.normal("calibration", number(spec.get("calibration error", 0.03)))
        self._offset_mw = draws.normal("zero", number(spec.get("zero", 5e-9))) * 1e3
        self._noise_mw = number(spec.get("noise", 1e-9)) * 1e3
        self._reading_s = number(spec.get("reading", 0.05))
        self._generator = draws.generator("noise")
        self.reset()
        self._settings = Settings(
            self, self.may_change, self.changed,
            scientific=chosen("manners", manners, "numbers", "plain", "scientific") == "scientific",
        )  # fmt: skip
        self._add_commands()
        world.own(
            self.port, match_of(draws, number(spec.get("match", 26.0))), owner=f"power meter {identity[2]}"
        )

    def _add_commands(self) -> None:
        settings, add = self._settings, self.tree.add
        add("[SENSe]:FREQuency[:CW]", settings.number("frequency", self._ends_hz, FREQUENCY))
        add("[SENSe]:AVERage:COUNt", settings.count("averages", 1, 1024))
        add("CALibration:ZERO:AUTO", Command(self._zero, lambda _: "0", 1, 1))
        add("UNIT:POWer", Command(self._set_unit, lambda _: self.unit, 1, 1))
        self.add_trigger_commands()
        add("FETCh[:SCALar][:POWer][:AC]", Command(get=lambda _: self._fetched(), measures=True))
        add("READ[:SCALar][:POWer][:AC]", Command(get=lambda _: self._read()))
        add("MEASure[:SCALar]:POWer[:AC]", Command(get=lambda _: self._measure()))

    def reset(self) -> None:
        """50 MHz or the nearest there is, four averages, dBm."""
        self.frequency = min(max(50e6, self._ends_hz[0]), self._ends_hz[1])
        self.averages, self.unit = 4, "DBM"
        self.power_mw: float | None = None
        self.idle()
        self.status.questionable.put(_POWER, False)

    @property
    def duration_s(self) -> float:
        """Of a reading."""
        return self._reading_s * self.averages

    def forget(self) -> None:
        """No reading."""
        self.power_mw = None

    # -- physics -----------------------------------------------------------------------------------------

    def efficiency(self, f_hz: Real) -> Real:
        """Share of the power that the head turns into a reading, ``(f,)``, linear."""
        return np.asarray(10 ** (-self._falls_db * np.minimum(f_hz / self._ends_hz[1], 3.0) / 10))

    def take(self) -> None:
        """Read what arrives: tones and noise of the whole range, corrected at one frequency."""
        with self.wired.lock:
            arriving = self.wired.arriving(self.port)
        seen = float(np.sum(np.abs(arriving.wave) ** 2 * self.efficiency(arriving.f_hz)))
        grid = np.linspace(*self._ends_hz, _BANDWIDTH_STEPS)
        excess = np.maximum(arriving.noise(grid) - KT0_MW_HZ, 0.0)
        seen += float(np.mean(excess * self.efficiency(grid))) * (self._ends_hz[1] - self._ends_hz[0])
        scatter = self._noise_mw / np.sqrt(self.averages) * float(self._generator.standard_normal())
        known = float(self.efficiency(np.array([self.frequency]))[0]) * milliwatt(-self._error_db)
        self.power_mw = (seen + self._offset_mw + scatter) / known
        self.status.questionable.put(_POWER, seen > milliwatt(self._ends_dbm[1]))

    # -- commands ----------------------------------------------------------------------------------------

    def _zero(self, parameters: tuple[str, ...]) -> None:
        choice(parameters[0], "ONCE")
        self.may_change()
        self.world.advance(5.0)
        with self.wired.lock:
            arriving = self.wired.arriving(self.port)
        if float(np.sum(np.abs(arriving.wave) ** 2)) > 10 * self._noise_mw:
            raise ScpiError(-340, "power arrives while zeroing")
        self._offset_mw = self._noise_mw / 10 * float(self._generator.standard_normal())
        self.changed()

    def _set_unit(self, parameters: tuple[str, ...]) -> None:
        self.unit = choice(parameters[0], "DBM", "W")

    def _read(self) -> str:
        self.initiate()
        if self._due is None:
            self.abort()
            raise ScpiError(-214, "readings are asked for and nothing will trigger them")
        self.world.advance(self._due - self.world.time_s)
        return self._fetched()

    def _measure(self) -> str:
        self.averages = 4
        self.idle()
        return self._read()

    def _fetched(self) -> str:
        self.fetch()
        assert self.power_mw is not None  # fetched
        if self.status.questionable.condition & (1 << _POWER):
            return "9.91E+37"
        if self.unit == "W":
            return self._settings.words(self.power_mw * 1e-3)
        # Below nothing there is no level; the lowest that is shown stands for it.
        return self._settings.words(round(10 * float(np.log10(max(self.power_mw, 1e-10))), 4))
