"""A signal generator.

It understands, beside the common commands, ``SYSTem`` and ``STATus`` (brackets: may be left out)::

    [SOURce]:FREQuency[:CW] <Hz>|MIN|MAX|DEF      [SOURce]:FREQuency[:CW]? [MIN|MAX|DEF]
    [SOURce]:FREQuency:FIXed                      the same setting
    [SOURce]:POWer[:LEVel][:IMMediate][:AMPLitude] <dBm>|MIN|MAX|DEF, and its query
    OUTPut[:STATe] ON|OFF|1|0, and its query

A setting takes its settling time, which ``*OPC``, ``*OPC?`` and ``*WAI`` heed. ``*RST``: output off.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.instruments.outlets import match_of
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import Settings, allowed, chosen, limit
from sim_instruments.instruments.signals import KT0_MW_HZ, Signal, milliwatt
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.parameters import FREQUENCY, POWER
from sim_instruments.values import number
from sim_instruments.waves import Plane

__all__ = ["Generator"]


class Generator(Instrument):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands.
    identity
        Four fields of ``*IDN?``.
    spec
        ``ports``: its one outlet; two generators on the same one are joined by a combiner of
        ``combiner`` (dB) each. ``limits``: ``frequency``, ``power``. ``match`` (return loss, dB);
        ``harmonics``: dBc of the second, third and so on; ``spurious``: a list of ``{offset, level}``, Hz
        from the carrier and dBc; ``level error`` and ``flatness`` (dB, one standard
        deviation); ``drift`` (dB/K); ``resolution`` of the level (dB) and ``step`` of the frequency (Hz);
        ``reference``: relative frequency error (one standard deviation); ``noise`` (dBm in 1 Hz);
        ``settling`` (s). ``manners``: ``beyond limits``: refuse or nearest; ``source node``: optional or
        required; ``numbers``: plain or scientific.
    draws
        What makes this specimen.

    Raises
    ------
    ValueError
        If the description makes no sense.
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
            "a signal generator", spec, "kind", "model", "serial", "ports", "combiner", "limits", "manners",
            "match", "harmonics", "level error", "flatness", "drift", "resolution", "step", "reference",
            "noise", "settling", "spurious",
        )  # fmt: skip
        allowed("limits", spec.get("limits", {}), "frequency", "power")
        self._ends_hz = limit(spec, "frequency", 100e3, 6e9)
        self._ends_dbm = limit(spec, "power", -110.0, 15.0)
        self._less_db = number(spec.get("combiner", 0.0))
        self._harmonics_db = [-abs(number(h)) for h in spec.get("harmonics", (-35.0, -45.0))]
        self._phases = [draws.phase(f"harmonic {k}") for k in range(len(self._harmonics_db))]
        self._spurs = []
        for spur in spec.get("spurious", ()):
            allowed("a spurious line", spur, "offset", "level")
            self._spurs.append((number(spur["offset"]), -abs(number(spur["level"]))))
        self._error_db = draws.normal("level", number(spec.get("level error", 0.2)))
        self._flatness_db = number(spec.get("flatness", 0.15))
        self._ripples = [
            (draws.uniform(f"ripple {k}", 0.2e-9, 3e-9), draws.uniform(f"ripple phase {k}", 0.0, 6.28))
            for k in range(3)
        ]
        self._drift_db_k = number(spec.get("drift", 0.01))
        self._resolution_db = number(spec.get("resolution", 0.01))
        self._step_hz = number(spec.get("step", 0.1))
        self._off = draws.normal("reference", number(spec.get("reference", 1e-7)))
        self._noise_mw_hz = milliwatt(number(spec.get("noise", -150.0)))
        self._settling_s = number(spec.get("settling", 3e-3))
        self._due: float | None = None
        self._world = world
        manners = spec.get("manners", {})
        allowed("manners", manners, "beyond limits", "source node", "numbers")
        self.reset()
        settings = Settings(
            self, changed=self._changed,
            nearest=chosen("manners", manners, "beyond limits", "refuse", "nearest") == "nearest",
            scientific=chosen("manners", manners, "numbers", "plain", "scientific") == "scientific",
        )  # fmt: skip
        optional = chosen("manners", manners, "source node", "optional", "required") == "optional"
        self._add_commands(settings, "[SOURce]" if optional else "SOURce")
        world.own(
            int(spec["ports"][0]),
            match_of(draws, number(spec.get("match", 18.0))),
            self,
            owner=f"generator {identity[2]}",
        )

    def _add_commands(self, settings: Settings, source: str) -> None:
        frequency = settings.number("frequency", self._ends_hz, FREQUENCY, self._set_frequency)
        self.tree.add(f"{source}:FREQuency[:CW]", frequency)
        self.tree.add(f"{source}:FREQuency:FIXed", frequency)
        self.tree.add(
            f"{source}:POWer[:LEVel][:IMMediate][:AMPLitude]",
            settings.number("power", self._ends_dbm, POWER, self._set_power),
        )
        self.tree.add("OUTPut[:STATe]", settings.switch("output"))

    def reset(self) -> None:
        """Output off, lowest level, middle of the range."""
        low, high = self._ends_hz
        self.frequency, self.power, self.output = min(max(100e6, low), high), self._ends_dbm[0], False
        self._due = None

    # -- settings ----------------------------------------------------------------------------------------

    def _set_frequency(self, f_hz: float) -> None:
        steps = round(f_hz / self._step_hz) * self._step_hz
        self.frequency = min(max(steps, self._ends_hz[0]), self._ends_hz[1])

    def _set_power(self, level_dbm: float) -> None:
        steps = round(level_dbm / self._resolution_db) * self._resolution_db
        self.power = round(min(max(steps, self._ends_dbm[0]), self._ends_dbm[1]), 9)

    def _changed(self) -> None:
        self._due = self.world.time_s + self._settling_s

    def ready_s(self, readings: bool) -> float | None:
        """When level and frequency have settled."""
        return self._due

    def refresh(self) -> None:
        """Settled when the time is up."""
        if self._due is not None and self.world.time_s >= self._due - 1e-9:
            self._due = None
        super().refresh()

    def asked(self) -> None:
        """A poll takes a millisecond."""
        if self._due is not None:
            self.world.advance(1e-3)

    # -- what comes out ----------------------------------------------------------------------------------

    def true_level_dbm(self, f_hz: float) -> float:
        """Level of the carrier into 50 ohm, behind the combiner if there is one."""
        ripple = sum(float(np.sin(2 * np.pi * f_hz * delay + phase)) for delay, phase in self._ripples)
        error_db = self._error_db + self._flatness_db * ripple * np.sqrt(2.0 / 3.0)
        warm = self._drift_db_k * (self.world.temperature() - 23.0)
        return self.power + float(error_db) + warm - self._less_db

    def signal(self) -> Signal:
        """The carrier with harmonics, spurious lines and broadband noise; off: noise of a termination."""
        if not self.output:
            return Signal.none()
        f_hz = self.frequency * (1 + self._off)
        level = self.true_level_dbm(f_hz)
        levels = np.array([level, *(level + below for below in self._harmonics_db)])
        wave: Plane = 10 ** (levels / 20) * np.array([1.0 + 0j, *self._phases])
        tones = f_hz * np.arange(1, len(levels) + 1, dtype=np.float64)
        beside = [(f_hz + offset, level + below) for offset, below in self._spurs if f_hz + offset > 0]
        if beside:
            tones = np.concatenate([tones, [f for f, _ in beside]])
            wave = np.concatenate([wave, [10 ** (spur / 20) for _, spur in beside]])
        less = self._noise_mw_hz * 10 ** (-self._less_db / 10)
        return Signal(tones, wave, lambda at_hz: np.full(len(at_hz), KT0_MW_HZ + less))
