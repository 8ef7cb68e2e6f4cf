"""Instruments in trouble that they may report. What each class says is what a careful engineer would see."""

from __future__ import annotations

from typing import Any

import numpy as np

from sim_instruments.faults.line import FaultyLine, InstrumentFault
from sim_instruments.faults.when import When
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.waves import Matrix, Real

__all__ = ["ErrorQueued", "Overload", "QueueOverflow", "Restart", "Unlock"]


class ErrorQueued(InstrumentFault):
    """An error stands in the queue that no request caused: -310, a system error. Answers are as usual."""

    def watch(self, line: FaultyLine, when: When) -> None:
        """Occasions are messages and waits."""
        if when():
            line.instrument.status.report(ScpiError(-310, "self-test of the source"))


class QueueOverflow(InstrumentFault):
    """The queue is full of -310 and ends in -350: what came after its end is lost."""

    once = True

    def watch(self, line: FaultyLine, when: When) -> None:
        """Occasions are messages and waits."""
        if when():
            while not _full(line):
                line.instrument.status.report(ScpiError(-310))


def _full(line: FaultyLine) -> bool:
    errors = line.instrument.status.errors
    return bool(errors) and str(errors[-1]).startswith("-350")


class Restart(InstrumentFault):
    """In mid-sweep the instrument starts anew.

    No answer comes, power-on stands in the event status register, settings are those of
    ``*RST``, and what it measures next is another sweep.
    """

    once = True

    def watch(self, line: FaultyLine, when: When) -> None:
        """Occasions are messages after which a sweep runs."""
        instrument = line.instrument
        if instrument.ready_s(False) is not None and when():
            instrument.reset()
            instrument.status.clear()
            instrument.status.esr = 128
            line.clear()
            line.mute = True


class _SpoiltReadings(InstrumentFault):
    """Readings go wrong, and a bit of the questionable register says so. Occasions are sweeps."""

    bit = 0

    def __init__(self) -> None:
        self.active = False

    def attach(self, instrument: Instrument, when: When) -> None:
        """Stand between the instrument and its readings, if it has any."""
        owner: Any = instrument
        if hasattr(owner, "readings"):
            owner.readings = _Between(owner.readings, self, when)

    def watch(self, line: FaultyLine, when: When) -> None:
        """Hold the bit while it lasts."""
        if self.active:
            line.instrument.status.questionable.put(self.bit, True)

    def change(self, f_hz: Real, m: Matrix, generator: np.random.Generator) -> Matrix:
        """What becomes of the readings, ``(f, 2, 2)``."""
        raise NotImplementedError


class _Between:
    """Readings with a fault."""

    def __init__(self, inner: Any, fault: _SpoiltReadings, when: When) -> None:
        self.inner, self.fault, self.when = inner, fault, when

    def __getattr__(self, name: str) -> Any:
        return getattr(self.inner, name)

    def read(
        self, f_hz: Real, bandwidth_hz: float, power_dbm: float, averages: int, source_on: bool
    ) -> Matrix:
        m: Matrix = self.inner.read(f_hz, bandwidth_hz, power_dbm, averages, source_on)
        self.fault.active = self.when()
        return self.fault.change(f_hz, m, self.when.generator) if self.fault.active else m


class Unlock(_SpoiltReadings):
    """The reference is not locked.

    Phases wander from point to point by tens of degrees, and bit 5 (frequency) of the
    questionable condition is set.
    """

    bit = 5

    def change(self, f_hz: Real, m: Matrix, generator: np.random.Generator) -> Matrix:
        """Phase noise."""
        return np.asarray(m * np.exp(0.4j * generator.standard_normal(m.shape)))


class Overload(_SpoiltReadings):
    """A receiver is driven too hard.

    Large readings come low by some tenths of a decibel, small ones do not, and bit 3
    (power) of the questionable condition is set.
    """

    bit = 3

    def change(self, f_hz: Real, m: Matrix, generator: np.random.Generator) -> Matrix:
        """Compression that begins some 10 dB below a full reading."""
        return np.asarray(m / np.sqrt(1 + 0.15 * np.abs(m) ** 2))
