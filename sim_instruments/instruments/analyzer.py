"""A two-port network analyzer that speaks SCPI; what it reads comes from a source of readings behind it."""

from __future__ import annotations

import contextlib
import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.instruments.front import add_commands
from sim_instruments.instruments.manners import Limits, Manners
from sim_instruments.instruments.readings import Readings
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.waves import Matrix, Real
from sim_instruments.world import World

__all__ = ["Analyzer"]

_SETTLE_S = 100e-6
_OVERLOAD_DBM = 12.0
_INSTANT_S = 1e-9
"""Times nearer than this are the same."""
_SWEEPING, _WAITING, _OVERLOADED, _COLD = 3, 5, 3, 4
"""Bits of the OPERation register, and of QUEStionable (power, temperature)."""


class Analyzer(Instrument):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands.
    readings
        What it reads.
    identity
        Maker, model, serial, firmware; the maker of anything simulated is ``SIMULATED``.
    limits, manners
        What sets this family apart, see :mod:`sim_instruments.instruments.manners`.

    Raises
    ------
    ValueError
        If limits or manners make no sense.
    """

    def __init__(
        self,
        world: World,
        readings: Readings,
        identity: tuple[str, str, str, str],
        limits: Mapping[str, Any] | None = None,
        manners: Mapping[str, Any] | None = None,
    ) -> None:
        super().__init__(world, identity)
        self.readings = readings
        self.limits, self.manners = Limits.read(limits or {}), Manners.read(manners or {})
        self._due: float | None = None
        self._armed = False
        self.reset()
        add_commands(self)

    def reset(self) -> None:
        """Sweep over everything, source off, ASCii, nothing read."""
        self.start, self.stop = self.limits.frequency
        self.points, self.spacing = min(201, self.limits.points), "LINear"
        self.mode, self.listed = "SWEep", list[float]()
        self.bandwidth = self.manners.bandwidth(min(1e3, self.limits.bandwidth[1]))
        self.power = min(max(-10.0, self.limits.power[0]), self.limits.power[1])
        self.power_mode, (self.power_start, self.power_stop) = "FIXed", self.limits.power
        self.fixed = (self.start + self.stop) / 2
        self.averages, self.averaging = 1, False
        self.output, self.continuous = False, False
        self.form, self.digits, self.border = "ASCii", 0, "NORMal"
        self.feed, self.trigger = (1, 1), "IMMediate"
        self._result: tuple[Real, Matrix] | None = None
        self._renewed = False
        self._idle()
        self.status.questionable.put(_OVERLOADED, False)

    def grid(self) -> Real:
        """Frequencies of the next sweep, ``(f,)``."""
        if self.power_mode == "SWEep":
            return np.full(self.points, self.fixed)
        if self.mode == "LIST":
            return np.array(self.listed)
        space = np.geomspace if self.spacing == "LOGarithmic" else np.linspace
        return np.asarray(space(self.start, self.stop, self.points), np.float64)

    def levels(self) -> Real:
        """Levels of the next sweep, ``(f,)`` in dBm."""
        if self.power_mode == "SWEep":
            return np.linspace(self.power_start, self.power_stop, self.points)
        return np.full(len(self.grid()), self.power)

    @property
    def sweep_s(self) -> float:
        """Both directions; a point takes the filter's settling, about 1.3 / bandwidth, and the source's."""
        listed = self.mode == "LIST" and self.power_mode == "FIXed"
        count = len(self.listed) if listed else self.points
        times = self.averages if self.averaging else 1
        return 2.0 * count * times * (1.3 / self.bandwidth + _SETTLE_S)

    # -- sweeping ----------------------------------------------------------------------------------------

    def initiate(self) -> None:
        """One sweep, now or when it is triggered.

        Raises
        ------
        ScpiError
            -213 if a sweep runs or waits already, -221 if the settings allow none.
        """
        self.refresh()
        if self.continuous or self._armed or self._due is not None:
            raise ScpiError(-213)
        self._arm()

    def set_continuous(self, on: bool) -> None:
        """One sweep after the other, or none after the one that runs."""
        if on and not self.continuous and self._due is None and not self._armed:
            self._arm()
        elif not on and self._armed:
            self._idle()
        self.continuous = on

    def set_trigger(self, source: str) -> None:
        """Where triggers come from; a sweep that waits for one starts at once if none is needed any more."""
        self.trigger = source
        if self._armed and source == "IMMediate":
            self._start()

    def abort(self) -> None:
        """Back to idle; continuous sweeping starts afresh from there."""
        self._idle()
        if self.continuous:
            self._arm()

    def fire(self) -> None:
        """Start the sweep that waits for the bus."""
        if not self._armed or self.trigger != "BUS":
            raise ScpiError(-211)
        self._start()

    def may_change(self) -> None:
        """Raise -221 where this family takes no setting in mid-sweep."""
        self.refresh()
        if self._due is not None and not self.continuous and self.manners.while_sweeping == "refuse":
            raise ScpiError(-221, "a sweep runs")

    def changed(self) -> None:
        """A setting that bears on the sweep was changed: readings so far are not what is asked for now."""
        self._result, self._renewed = None, False
        self._idle()
        if self.continuous:
            with contextlib.suppress(ScpiError):  # in between two settings there may be nothing to sweep
                self._arm()

    def _arm(self) -> None:
        if self.power_mode == "SWEep":
            if self.power_stop <= self.power_start:
                raise ScpiError(-221, "the stop power is not above the start power")
        elif self.mode == "LIST" and not self.listed:
            raise ScpiError(-221, "no list of frequencies")
        elif self.mode == "SWEep" and self.stop <= self.start:
            raise ScpiError(-221, "STOP is not above STARt")
        self._result, self._renewed = None, False
        if self.trigger == "IMMediate":
            self._start()
        else:
            self._armed = True
            self.status.operation.put(_WAITING, True)

    def _start(self) -> None:
        self._armed, self._due = False, self.world.time_s + self.sweep_s
        self.status.operation.put(_WAITING, False)
        self.status.operation.put(_SWEEPING, True)

    def _idle(self) -> None:
        self._due, self._armed = None, False
        self.status.operation.put(_SWEEPING, False)
        self.status.operation.put(_WAITING, False)

    def ready_s(self, readings: bool) -> float | None:
        """When the sweep ends; continuous sweeping is no pending operation, but its first brings readings."""
        if (readings and (self._result is not None or self._renewed)) or (self.continuous and not readings):
            return None
        return math.inf if self._armed else self._due

    def finish(self) -> None:
        """Let the sweep end."""
        if self._due is not None:
            self.world.advance(self._due - self.world.time_s)
            self.refresh()

    def refresh(self) -> None:
        """End the sweep if its time is up; say whether it is still warming up."""
        self.status.questionable.put(_COLD, self.readings.is_cold())
        if self._due is not None and self.world.time_s >= self._due - _INSTANT_S:
            if not self.continuous:
                self._idle()
                self._read()
            else:  # readings are made when somebody asks for them
                self._renewed = True
                if self.trigger == "IMMediate":
                    gone = math.floor((self.world.time_s - self._due) / self.sweep_s) + 1
                    self._due += gone * self.sweep_s
                else:
                    self._due, self._armed = None, True
                    self.status.operation.put(_SWEEPING, False)
                    self.status.operation.put(_WAITING, True)
        super().refresh()

    def asked(self) -> None:
        """A poll takes a millisecond, or a fiftieth of the sweep."""
        if self._due is not None:
            self.world.advance(max(1e-3, 0.02 * self.sweep_s))

    def _read(self) -> None:
        f_hz, averages = self.grid(), self.averages if self.averaging else 1
        self._renewed = False
        try:
            power = self.levels() if self.power_mode == "SWEep" else self.power
            m = self.readings.read(f_hz, self.bandwidth, power, averages, self.output)
        except ScpiError as error:
            self._result = None
            self.status.report(error)
            return
        into = np.max(power + 20 * np.log10(np.max(np.abs(m), axis=(1, 2)) + 1e-30))
        self.status.questionable.put(_OVERLOADED, bool(self.output and into > _OVERLOAD_DBM))
        self._result = f_hz if self.power_mode == "FIXed" else self.levels(), m

    def switch_terms(self) -> Matrix:
        """Waves of the idle port, ``a2/b2`` and ``a1/b1``, as read in the last sweep, ``(f, 2)``.

        Raises
        ------
        ScpiError
            -230 if there is no sweep, -241 where nothing reads them.
        """
        grid, _ = self.measured()
        return self.readings.switch_terms(grid if self.power_mode == "FIXed" else self.grid())

    def measured(self) -> tuple[Real, Matrix]:
        """Grid, in Hz or of a power sweep in dBm, and raw readings ``(f, 2, 2)`` of the last sweep.

        Raises
        ------
        ScpiError
            -230 if there is none.
        """
        self.refresh()
        if self._renewed:
            self._read()
        if self._result is None:
            raise ScpiError(-230)
        return self._result
