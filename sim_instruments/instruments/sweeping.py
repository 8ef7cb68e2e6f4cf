"""An instrument that measures when it is initiated: INITiate, ABORt, TRIGger, with overlapped operations.

``INITiate[:IMMediate][:ALL]``, ``INITiate:CONTinuous ON|OFF`` and ``?``, ``ABORt``,
``TRIGger[:SEQuence]:SOURce IMMediate|BUS|EXTernal`` and ``?``; ``*TRG`` fires BUS. Bit 3 of OPERation: it
measures; bit 5: it waits for a trigger. Results asked for are waited for.
"""

from __future__ import annotations

import math

from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.parameters import boolean, choice, short
from sim_instruments.scpi.tree import Command
from sim_instruments.world import World

__all__ = ["Sweeping"]

_SWEEPING, _WAITING = 3, 5
_INSTANT_S = 1e-9


class Sweeping(Instrument):
    """Base of instruments with one trigger sequence.

    Parameters
    ----------
    world, identity
        As of every instrument.
    refuses
        A setting in mid-measurement reports -221 instead of ending it.
    """

    def __init__(self, world: World, identity: tuple[str, str, str, str], refuses: bool = False) -> None:
        super().__init__(world, identity)
        self.refuses = refuses
        self._due: float | None = None
        self._armed = self._fresh = False
        self.continuous, self.trigger = False, "IMMediate"

    # -- what an instrument kind says --------------------------------------------------------------------

    @property
    def duration_s(self) -> float:
        """Of one measurement."""
        raise NotImplementedError

    def take(self) -> None:
        """Measure the world as it is at the end of the time."""
        raise NotImplementedError

    def forget(self) -> None:
        """There is no result any more."""
        raise NotImplementedError

    # -- commands ----------------------------------------------------------------------------------------

    def add_trigger_commands(self) -> None:
        """Teach it INITiate, ABORt and TRIGger."""
        add = self.tree.add
        add("INITiate[:IMMediate][:ALL]", Command(lambda _: self.initiate()))
        add("INITiate:CONTinuous", Command(
            lambda p: self.set_continuous(boolean(p[0])),
            lambda _: str(int(self.continuous)), 1, 1))  # fmt: skip
        add("ABORt", Command(lambda _: self.abort()))
        add("TRIGger[:SEQuence]:SOURce", Command(
            lambda p: self._set_trigger(choice(p[0], "IMMediate", "BUS", "EXTernal")),
            lambda _: short(self.trigger), 1, 1))  # fmt: skip

    def idle(self) -> None:
        """Nothing runs, nothing waits, nothing was measured: as after ``*RST``."""
        self.continuous, self.trigger = False, "IMMediate"
        self._stop()
        self._fresh = False
        self.forget()

    def initiate(self) -> None:
        """Measure once, now or when it is triggered.

        Raises
        ------
        ScpiError
            -213 if it does or waits already.
        """
        self.refresh()
        if self.continuous or self._armed or self._due is not None:
            raise ScpiError(-213)
        self._arm()

    def set_continuous(self, on: bool) -> None:
        """One after the other, or none after the one that runs."""
        if on and not self.continuous and self._due is None:
            self._arm()
        elif not on and self._armed:
            self._stop()
        self.continuous = on

    def abort(self) -> None:
        """Back to idle; continuous measuring starts afresh from there."""
        self._stop()
        if self.continuous:
            self._arm()

    def fire(self) -> None:
        """Start what waits for the bus."""
        if not self._armed or self.trigger != "BUS":
            raise ScpiError(-211)
        self._start()

    def may_change(self) -> None:
        """Raise -221 if no setting is taken now."""
        self.refresh()
        if self._due is not None and not self.continuous and self.refuses:
            raise ScpiError(-221, "a measurement runs")

    def changed(self) -> None:
        """A setting was changed: what was measured is not what is asked for now."""
        self.forget()
        self._fresh = False
        self._stop()
        if self.continuous:
            self._arm()

    def _set_trigger(self, source: str) -> None:
        self.trigger = source
        if self._armed and source == "IMMediate":
            self._start()

    def _arm(self) -> None:
        self.forget()
        self._fresh = False
        if self.trigger == "IMMediate":
            self._start()
        else:
            self._armed = True
            self.status.operation.put(_WAITING, True)

    def _start(self) -> None:
        self._armed, self._due = False, self.world.time_s + self.duration_s
        self.status.operation.put(_WAITING, False)
        self.status.operation.put(_SWEEPING, True)

    def _stop(self) -> None:
        self._armed, self._due = False, None
        self.status.operation.put(_WAITING, False)
        self.status.operation.put(_SWEEPING, False)

    # -- time --------------------------------------------------------------------------------------------

    @property
    def has_result(self) -> bool:
        """Whether there is something to fetch."""
        return self._fresh

    def ready_s(self, readings: bool) -> float | None:
        """When the measurement ends; measuring on and on is no pending operation."""
        if (readings and self._fresh) or (self.continuous and not readings):
            return None
        return math.inf if self._armed else self._due

    def refresh(self) -> None:
        """End the measurement if its time is up."""
        if self._due is not None and self.world.time_s >= self._due - _INSTANT_S:
            self._fresh = True
            if not self.continuous:
                self._stop()
                self.take()
            elif self.trigger == "IMMediate":  # taken when somebody asks
                gone = math.floor((self.world.time_s - self._due) / self.duration_s) + 1
                self._due += gone * self.duration_s
            else:
                self.take()
                self._stop()
                self._armed = True
                self.status.operation.put(_WAITING, True)
        super().refresh()

    def asked(self) -> None:
        """A poll takes a millisecond, or a fiftieth of the measurement."""
        if self._due is not None:
            self.world.advance(max(1e-3, 0.02 * self.duration_s))

    def fetch(self) -> None:
        """Bring the result up to date.

        Raises
        ------
        ScpiError
            -230 if there is none.
        """
        self.refresh()
        if not self._fresh:
            raise ScpiError(-230)
        if self.continuous and self.trigger == "IMMediate":
            self.take()
