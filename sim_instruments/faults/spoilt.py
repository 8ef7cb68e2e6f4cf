"""Readings and signals that go wrong, with a bit that says so. Each class says what an engineer would see."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np

from sim_instruments.faults.line import FaultyLine, InstrumentFault
from sim_instruments.faults.when import When
from sim_instruments.instruments.analyzer import Analyzer
from sim_instruments.instruments.generator import Generator
from sim_instruments.instruments.power_meter import PowerMeter
from sim_instruments.instruments.signals import Signal
from sim_instruments.instruments.spectrum import SpectrumAnalyzer
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.waves import Matrix, Real

__all__ = ["Overload", "Unlock"]

_WANDER = 3e-5
"""Relative frequency error of an oscillator that has lost its reference, one standard deviation."""
_UNLEVELLED_DB = 3.0


class _Spoilt(InstrumentFault):
    """Occasions are sweeps; those of a generator, measurements of what it sends."""

    bit = 0

    def __init__(self) -> None:
        self.active = False

    def attach(self, instrument: Instrument, when: When) -> None:
        """Stand between the instrument and what it reads or sends."""
        owner: Any = instrument
        if isinstance(instrument, Analyzer):
            owner.readings = _Between(owner.readings, self, when)
        elif isinstance(instrument, Generator):
            owner.signal = self._sending(instrument, instrument.signal, when)
        elif self.suits(instrument):
            owner.take = self._taking(owner, owner.take, when)

    def watch(self, line: FaultyLine, when: When) -> None:
        """Hold the bit while it lasts."""
        if self.active:
            line.instrument.status.questionable.put(self.bit, True)

    def _sending(self, owner: Generator, signal: Callable[[], Signal], when: When) -> Callable[[], Signal]:
        def spoilt() -> Signal:
            if not owner.output:
                return signal()
            self.active = when()
            owner.status.questionable.put(self.bit, self.active)
            return self.sent(signal(), when.generator) if self.active else signal()

        return spoilt

    def _taking(self, owner: Any, take: Callable[[], None], when: When) -> Callable[[], None]:
        def spoilt() -> None:
            self.active = when()
            if not self.active:
                owner.status.questionable.put(self.bit, False)  # unless the sweep finds a reason of its own
                take()
                return
            self.taken(owner, take, when.generator)
            owner.status.questionable.put(self.bit, True)

        return spoilt

    def read(self, m: Matrix, generator: np.random.Generator) -> Matrix:
        """What becomes of readings of a network analyzer, ``(f, 2, 2)``."""
        raise NotImplementedError

    def sent(self, signal: Signal, generator: np.random.Generator) -> Signal:
        """What becomes of the signal of a generator."""
        raise NotImplementedError

    def taken(self, owner: Any, take: Callable[[], None], generator: np.random.Generator) -> None:
        """How a sweep of a spectrum analyzer or a reading of a power meter goes."""
        raise NotImplementedError


class _Between:
    """Readings of a network analyzer with a fault."""

    def __init__(self, inner: Any, fault: _Spoilt, when: When) -> None:
        self.inner, self.fault, self.when = inner, fault, when

    def __getattr__(self, name: str) -> Any:
        return getattr(self.inner, name)

    def read(
        self, f_hz: Real, bandwidth_hz: float, power_dbm: float | Real, averages: int, source_on: bool
    ) -> Matrix:
        m: Matrix = self.inner.read(f_hz, bandwidth_hz, power_dbm, averages, source_on)
        self.fault.active = self.when()
        return self.fault.read(m, self.when.generator) if self.fault.active else m


class Unlock(_Spoilt):
    """The reference is not locked: bit 5 (frequency) of the questionable condition is set.

    Phases of a network analyzer wander from point to point by tens of degrees; lines of a spectrum analyzer
    or a generator stand some kilohertz away, elsewhere at every sweep, and a narrow filter reads them low.
    """

    bit = 5

    def suits(self, instrument: Instrument) -> bool:
        """What has an oscillator."""
        return isinstance(instrument, Analyzer | Generator | SpectrumAnalyzer)

    def read(self, m: Matrix, generator: np.random.Generator) -> Matrix:
        """Phase noise."""
        return np.asarray(m * np.exp(0.4j * generator.standard_normal(m.shape)))

    def sent(self, signal: Signal, generator: np.random.Generator) -> Signal:
        """Another frequency."""
        return replace(signal, f_hz=signal.f_hz * (1 + _WANDER * generator.standard_normal()))

    def taken(self, owner: Any, take: Callable[[], None], generator: np.random.Generator) -> None:
        """Tuned elsewhere."""
        kept = owner.mixer.off
        owner.mixer.off = kept + _WANDER * float(generator.standard_normal())
        try:
            take()
        finally:
            owner.mixer.off = kept


class Overload(_Spoilt):
    """Something is driven too hard: bit 3 (power) of the questionable condition is set.

    Large readings of an analyzer come low by some tenths of a decibel, small ones do not; a power meter gives
    9.91E+37; a generator cannot level its output, and the carrier is some decibels low.
    """

    bit = 3

    def suits(self, instrument: Instrument) -> bool:
        """What has a receiver, or an amplifier at its output."""
        return isinstance(instrument, Analyzer | Generator | SpectrumAnalyzer | PowerMeter)

    def read(self, m: Matrix, generator: np.random.Generator) -> Matrix:
        """Compression that begins some 10 dB below a full reading."""
        return np.asarray(m / np.sqrt(1 + 0.15 * np.abs(m) ** 2))

    def sent(self, signal: Signal, generator: np.random.Generator) -> Signal:
        """Less than was asked for."""
        return replace(signal, wave=signal.wave * 10 ** (-_UNLEVELLED_DB / 20))

    def taken(self, owner: Any, take: Callable[[], None], generator: np.random.Generator) -> None:
        """Lines near the reference level come low."""
        take()
        if getattr(owner, "trace", None) is not None:
            near = owner.trace - owner.coupled.reference
            owner.trace = owner.trace - 10 * np.log10(1 + 0.15 * 10 ** (near / 10))
