"""Instruments in trouble that they may report. What each class says is what a careful engineer would see."""

from __future__ import annotations

from sim_instruments.faults.line import FaultyLine, InstrumentFault
from sim_instruments.faults.when import When
from sim_instruments.scpi.errors import ScpiError

__all__ = ["ErrorQueued", "QueueOverflow", "Restart"]


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
