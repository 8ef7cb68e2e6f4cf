"""An instrument whose line, or what comes over it, cannot be trusted."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

from sim_instruments.faults.when import When
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.line import Line

__all__ = ["FaultyInstrument", "FaultyLine", "InstrumentFault", "bare"]


class InstrumentFault:
    """A way in which instruments go wrong. Occasions are answers that it fits, unless it says otherwise."""

    once = False

    def suits(self, instrument: Instrument) -> bool:
        """Whether an instrument of this kind can have it at all."""
        return True

    def attach(self, instrument: Instrument, when: When) -> None:
        """Called when the instrument gets the fault."""

    def fits(self, response: bytes, instrument: Instrument) -> bool:
        """Whether it could happen to this response."""
        return False

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """It happens to this response."""
        line.say(response)

    def watch(self, line: FaultyLine, when: When) -> None:
        """Called after each message and each wait."""


class FaultyLine(Line):
    """A line with faults.

    Parameters
    ----------
    instrument, sink
        As of a line.
    faults
        What goes wrong, each with what says whether it does; the first that happens to a response is the one.
    """

    def __init__(
        self,
        instrument: Instrument,
        sink: Callable[[bytes], None] | None,
        faults: Sequence[tuple[InstrumentFault, When]],
    ) -> None:
        super().__init__(instrument, sink)
        self.faults = faults
        self.most = 0
        """Bytes given at a time; 0: as many as are asked for."""
        self.no_end = False
        """The end of the response never comes."""
        self.mute = False
        """The instrument believes that it has answered."""
        self.held_back: tuple[float, bytes] | None = None
        """A response, and when it comes."""

    def say(self, response: bytes) -> None:
        """Give a response as it is."""
        super()._say(response)

    def _say(self, response: bytes) -> None:
        self.mute = self.no_end = False
        for fault, when in self.faults:
            if fault.fits(response, self.instrument) and when():
                fault.spoil(self, response, when)
                return
        self.say(response)

    def _watch(self) -> None:
        for fault, when in self.faults:
            fault.watch(self, when)

    def receive(self, data: bytes, end: bool = False) -> None:
        """Take bytes of program messages."""
        self._release()
        super().receive(data, end)
        self._watch()

    def proceed(self, limit_s: float = float("inf")) -> None:
        """Let the world go on; a response held back comes if the wait has an end and is long enough."""
        world = self.instrument.world
        # Without an end the wait is for pending operations; whoever waits so gives up by a clock of his own.
        if self.held_back is not None and self.held_back[0] <= world.time_s + limit_s < float("inf"):
            world.advance(self.held_back[0] - world.time_s)
        self._release()
        if not self.has_output:
            super().proceed(limit_s)
        self._watch()

    def _release(self) -> None:
        if self.held_back is not None and self.instrument.world.time_s >= self.held_back[0]:
            (_, response), self.held_back = self.held_back, None
            self.say(response)

    def take(self, count: int, until: int | None = None) -> tuple[bytes, bool]:
        """Give bytes of the response."""
        data, ended = super().take(min(count, self.most) if self.most else count, until)
        return data, ended and not self.no_end

    def unasked(self) -> None:
        """Note a read with nothing to say, unless the instrument believes that it has said it."""
        if not self.mute and self.held_back is None:
            super().unasked()

    def clear(self) -> None:
        """Device clear."""
        self.held_back = None
        super().clear()


def bare(instrument: Instrument) -> tuple[Instrument, tuple[tuple[InstrumentFault, When], ...]]:
    """An instrument without its faults, and these."""
    faulty: object = instrument
    if isinstance(faulty, FaultyInstrument):
        return faulty.instrument, faulty.faults
    return instrument, ()


class FaultyInstrument:
    """An instrument with faults, in front of the instrument itself.

    Parameters
    ----------
    instrument
        What it would be without; one that is faulty already keeps its faults.
    fault
        What goes wrong.
    when
        Whether it does.
    """

    def __init__(self, instrument: Instrument, fault: InstrumentFault, when: When) -> None:
        self.instrument, before = bare(instrument)
        self.faults = (*before, (fault, when))
        self.when = when
        fault.attach(self.instrument, when)

    def __getattr__(self, name: str) -> Any:
        return getattr(self.instrument, name)

    def line(self, sink: Callable[[bytes], None] | None = None) -> Line:
        """A line for one client."""
        return FaultyLine(self.instrument, sink, self.faults)
