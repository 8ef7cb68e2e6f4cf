"""A swept spectrum analyzer: what it does to the signal that runs into its outlet.

It understands, beside the common commands, ``SYSTem`` and ``STATus`` (brackets: may be left out)::

    [SENSe]:FREQuency:CENTer|SPAN|STARt|STOP <Hz>     [SENSe]:FREQuency:SPAN:FULL
    [SENSe]:BANDwidth[:RESolution] <Hz>               [SENSe]:BANDwidth[:RESolution]:AUTO ON|OFF
    [SENSe]:BANDwidth:VIDeo <Hz>                      [SENSe]:BANDwidth:VIDeo:AUTO ON|OFF
    [SENSe]:BWIDth...                                 the same
    [SENSe]:DETector[:FUNCtion] POSitive|SAMPle|AVERage
    [SENSe]:POWer[:AC]:ATTenuation <dB>               [SENSe]:POWer[:AC]:ATTenuation:AUTO ON|OFF
    [SENSe]:POWer[:AC]:RANGe[:UPPer] <dBm>            reference level; in the other dialect it is
    DISPlay[:WINDow]:TRACe:Y[:SCALe]:RLEVel <dBm>
    [SENSe]:SWEep:POINts <n>   [SENSe]:SWEep:TIME <s>   [SENSe]:SWEep:TIME:AUTO ON|OFF
    INITiate[:IMMediate][:ALL]   INITiate:CONTinuous ON|OFF   ABORt
    TRIGger[:SEQuence]:SOURce IMMediate|BUS|EXTernal
    TRACe[:DATA]? TRACE        levels in dBm          TRACe[:DATA]? GRID   frequencies in Hz
    TRACe:POINts? TRACE|GRID   TRACe:CATalog?
    FORMat[:DATA] ASCii[,digits]|REAL[,32|64]         FORMat:BORDer NORMal|SWAPped

each setting with its query, and with MIN, MAX, DEF where it is a number. Bit 3 of STATus:QUEStionable: the
mixer or what follows it was overloaded in the last sweep; bit 8: the sweep was too fast for its bandwidths.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.instruments.detectors import NOISE_BANDWIDTH, Sweep, seen_tone, shown
from sim_instruments.instruments.outlets import match_of
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import Format, allowed
from sim_instruments.instruments.signals import KT0_MW_HZ, Signal, dbm, milliwatt, products
from sim_instruments.instruments.spectrum_front import Coupled, add_commands
from sim_instruments.instruments.sweeping import Sweeping
from sim_instruments.parts.amplifier import compression
from sim_instruments.values import number
from sim_instruments.waves import Real

__all__ = ["Mixer", "SpectrumAnalyzer"]

_POWER, _CALIBRATION = 3, 8
"""Bits of the QUEStionable register."""


class Mixer:
    """What the front end of a spectrum analyzer does wrong.

    Parameters
    ----------
    spec
        ``noise figure`` (dB at no attenuation); ``second harmonic intercept``, ``third order intercept``,
        ``compression`` (1 dB), ``overload``: dBm at the mixer; ``headroom``: dB above the reference level at
        which the converter clips; ``phase noise``: dBc in 1 Hz at 10 kHz; ``level error``, ``flatness`` (dB,
        one standard deviation), ``attenuator error`` (dB for each 10 dB), ``drift`` (dB/K), ``reference``
        (relative); ``residual``: a list of ``{at, level}``, lines in Hz and dBm at the mixer that are there
        without any signal.
    draws
        What makes this specimen.
    """

    keys = (
        "noise figure", "second harmonic intercept", "third order intercept", "compression", "overload",
        "headroom", "phase noise", "level error", "flatness", "attenuator error", "drift", "reference",
        "residual",
    )  # fmt: skip

    def __init__(self, spec: Mapping[str, Any], draws: Draws) -> None:
        self.noise_figure_db = number(spec["noise figure"])
        self.harmonic_intercept_dbm = number(spec["second harmonic intercept"])
        self.third_intercept_dbm = number(spec["third order intercept"])
        self.compression_dbm = number(spec.get("compression", 5.0))
        self.overload_dbm = number(spec.get("overload", 0.0))
        self.headroom_db = number(spec.get("headroom", 3.0))
        self.phase_noise_dbc = number(spec.get("phase noise", -110.0))
        self.error_db = draws.normal("level", number(spec.get("level error", 0.15)))
        self.flatness_db = number(spec.get("flatness", 0.15))
        self.step_db = draws.normal("attenuator", number(spec.get("attenuator error", 0.05)))
        self.drift_db_k = number(spec.get("drift", 0.01))
        self.off = draws.normal("reference", number(spec.get("reference", 1e-7)))
        self.residual = []
        for line in spec.get("residual", ()):
            allowed("a residual line", line, "at", "level")
            self.residual.append((number(line["at"]), number(line["level"])))
        self._ripples = [
            (draws.uniform(f"ripple {k}", 0.2e-9, 3e-9), draws.uniform(f"ripple phase {k}", 0.0, 6.28))
            for k in range(3)
        ]

    def reads_high_db(self, f_hz: Real, attenuation_db: float, temperature_c: float) -> Real:
        """How much too high it reads, ``(f,)``."""
        ripple = sum(np.sin(2 * np.pi * f_hz * delay + phase) for delay, phase in self._ripples)
        steps = self.step_db * attenuation_db / 10.0
        warm = self.drift_db_k * (temperature_c - 23.0)
        return np.asarray(self.error_db + steps + warm + self.flatness_db * np.sqrt(2.0 / 3.0) * ripple)

    def mixed(self, arriving: Signal, attenuation_db: float) -> tuple[Signal, float]:
        """The signal with what the mixer adds, counted at the input again, and the total level it met.

        Noise at the mixer is kT0 times its noise figure, whatever stands before it: seen from the input it
        rises with the attenuation.
        """
        less = 10 ** (-attenuation_db / 20)
        wave = arriving.wave * less
        total = float(dbm(np.array(np.sum(np.abs(wave) ** 2))))
        f_hz = arriving.f_hz
        if len(wave):
            power = np.abs(wave) ** 2
            wave = wave * compression(dbm(2 * np.sum(power) - power), 0.0, self.compression_dbm - 1.0)
            second = self.harmonic_intercept_dbm - 20 * math.log10(2.0)
            f_hz, wave = products(f_hz, wave, second, self.third_intercept_dbm)
        own = KT0_MW_HZ * (milliwatt(attenuation_db + self.noise_figure_db) - 1.0)
        return Signal(f_hz, wave / less, lambda at_hz: arriving.noise(at_hz) + own), total

    def phase_noise_mw(self, f_hz: Real, tones: Signal) -> Real:
        """Density of the oscillator's noise on strong tones, ``(f,)``: falls by 20 dB a decade."""
        density = np.zeros(len(f_hz))
        for tone, wave in zip(tones.f_hz, tones.wave, strict=True):
            away = np.maximum(np.abs(f_hz - tone), 1e3)
            density += abs(wave) ** 2 * (milliwatt(self.phase_noise_dbc) * (1e4 / away) ** 2 + 1e-15)
        return density


class SpectrumAnalyzer(Sweeping):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands.
    identity
        Four fields of ``*IDN?``.
    spec
        ``ports``: its one outlet; ``match`` (return loss, dB); ``limits``: ``frequency``, ``bandwidth``,
        ``points``, ``reference`` (dBm), ``attenuation`` (greatest, dB), ``attenuation step`` (dB);
        ``manners`` as of :class:`~sim_instruments.instruments.manners.Manners`, and ``reference``: range or
        display, ``trace``: TRACE or TRACE1, ``numbers``: plain or scientific; ``mixer`` as of :class:`Mixer`.
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
        manners = spec.get("manners", {})
        super().__init__(world, identity, str(manners.get("while sweeping", "abort")) == "refuse")
        allowed(
            "a spectrum analyzer", spec, "kind", "model", "serial", "ports", "match", "limits", "manners",
            "mixer",
        )  # fmt: skip
        allowed("mixer", spec["mixer"], *Mixer.keys)
        self.wired, self.port = world, int(spec["ports"][0])
        self.mixer = Mixer(spec["mixer"], draws)
        self.generator = draws.generator("noise")
        self.coupled = Coupled(spec)
        self.format = Format()
        self.trace: Real | None = None
        self.reset()
        add_commands(self, manners)
        world.own(
            self.port,
            match_of(draws, number(spec.get("match", 16.0))),
            owner=f"spectrum analyzer {identity[2]}",
        )

    def reset(self) -> None:
        """Everything coupled, full span, single sweeps."""
        self.coupled.reset()
        self.format.reset()
        self.detector, self.points = "POSitive", min(401, self.coupled.most_points)
        self.idle()
        self.status.questionable.put(_POWER, False)
        self.status.questionable.put(_CALIBRATION, False)

    @property
    def duration_s(self) -> float:
        """Of a sweep."""
        return self.coupled.sweep_s(self.points)

    def grid(self) -> Real:
        """Middles of the buckets, ``(f,)``."""
        return np.linspace(self.coupled.start, self.coupled.stop, self.points)

    def forget(self) -> None:
        """No trace."""
        self.trace = None

    def take(self) -> None:
        """One sweep."""
        with self.wired.lock:
            arriving = self.wired.arriving(self.port)
            temperature_c = self.wired.temperature()
        c, grid = self.coupled, self.grid()
        mixed, total = self.mixer.mixed(arriving, c.attenuation)
        scale = 1 + self.mixer.off
        sweep = Sweep(grid, c.resolution, c.video, self.duration_s / self.points, self.detector)
        tones = np.zeros(len(grid))
        for f_hz, wave in zip(mixed.f_hz, mixed.wave, strict=True):
            tones += abs(wave) ** 2 * seen_tone(sweep, f_hz / scale)
        for f_hz, level_dbm in self.mixer.residual:
            tones += milliwatt(level_dbm + c.attenuation) * seen_tone(sweep, f_hz)
        density = mixed.noise(grid) + self.mixer.phase_noise_mw(grid, mixed)
        noise = density * NOISE_BANDWIDTH * c.resolution
        level = dbm(shown(sweep, tones, noise, self.generator))
        level += self.mixer.reads_high_db(grid, c.attenuation, temperature_c)
        level -= c.too_fast_db(self.points)
        top = c.reference + self.mixer.headroom_db
        clipped = bool(np.any(level > top))
        self.status.questionable.put(_POWER, clipped or total > self.mixer.overload_dbm)
        self.status.questionable.put(_CALIBRATION, c.too_fast_db(self.points) > 0.1)
        self.trace = np.minimum(level, top)
