"""A two-port network analyzer that speaks SCPI; what it reads comes from a source of readings behind it."""

from __future__ import annotations

import itertools
from typing import Protocol

import numpy as np

from sim_instruments.instruments.receivers import Receivers
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.message import FREQUENCY, POWER, boolean, choice, number, numbers, string
from sim_instruments.scpi.tree import Command
from sim_instruments.waves import Matrix, Real
from sim_instruments.world import World

__all__ = ["Analyzer", "Readings", "Simulated"]

_LOW_HZ, _HIGH_HZ = 9e3, 20e9
_MOST_POINTS = 100_001
_SETTLE_S = 100e-6
_OVERLOAD_DBM = 12.0
_SWEEPING, _OVERLOADED = 3, 3


class Readings(Protocol):
    """Where an analyzer's readings come from."""

    def read(
        self, f_hz: Real, bandwidth_hz: float, power_dbm: float, averages: int, source_on: bool
    ) -> Matrix:
        """Raw readings ``(f, 2, 2)`` of what is connected now.

        Raises
        ------
        ScpiError
            If it cannot be read.
        """
        ...


class Simulated:
    """Readings of a world by :class:`Receivers`."""

    def __init__(self, world: World, receivers: Receivers) -> None:
        self.world = world
        self.receivers = receivers

    def read(
        self, f_hz: Real, bandwidth_hz: float, power_dbm: float, averages: int, source_on: bool
    ) -> Matrix:
        """Raw readings."""
        if not source_on:
            return self.receivers.nothing(len(f_hz))
        device = self.world.between_ports(f_hz)
        return self.receivers.noisy(
            self.receivers.raw(f_hz, device, self.world.temperature()), bandwidth_hz, power_dbm, averages
        )


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
    """

    def __init__(self, world: World, readings: Readings, identity: tuple[str, str, str, str]) -> None:
        super().__init__(world, identity)
        self.readings = readings
        self.reset()
        self._add_sweep()
        self._add_source_and_format()
        self._add_reading()

    def reset(self) -> None:
        """Sweep over everything, source off, ASCii, nothing read."""
        self.start, self.stop, self.points, self.spacing = _LOW_HZ, _HIGH_HZ, 201, "LINear"
        self.mode, self.listed = "SWEep", list[float]()
        self.bandwidth, self.power, self.averages, self.averaging = 1e3, -10.0, 1, False
        self.output, self.continuous = False, False
        self.form, self.border, self.feed, self.trigger = "ASCii", "NORMal", (1, 1), "IMMediate"
        self._due: float | None = None
        self._result: tuple[Real, Matrix] | None = None
        self.status.operation.put(_SWEEPING, False)
        self.status.questionable.put(_OVERLOADED, False)

    def grid(self) -> Real:
        """Frequencies of the next sweep, ``(f,)``."""
        if self.mode == "LIST":
            return np.array(self.listed)
        space = np.geomspace if self.spacing == "LOGarithmic" else np.linspace
        return np.asarray(space(self.start, self.stop, self.points), np.float64)

    @property
    def sweep_s(self) -> float:
        """Both directions; a point takes the filter's settling, about 1.3 / bandwidth, and the source's."""
        count = len(self.listed) if self.mode == "LIST" else self.points
        times = self.averages if self.averaging else 1
        return 2.0 * count * times * (1.3 / self.bandwidth + _SETTLE_S)

    # -- sweeping ----------------------------------------------------------------------------------------

    def _initiate(self) -> None:
        if self._due is not None:
            raise ScpiError(-213)
        if self.mode == "LIST" and not self.listed:
            raise ScpiError(-221, "no list of frequencies")
        if self.stop <= self.start and self.mode == "SWEep":
            raise ScpiError(-221, "STOP is not above STARt")
        self._result = None
        self._due = self.world.time_s + self.sweep_s
        self.status.operation.put(_SWEEPING, True)

    def finish(self) -> None:
        """Let the sweep end."""
        if self._due is not None:
            self.world.advance(self._due - self.world.time_s)
            self._end_sweep()

    def refresh(self) -> None:
        """End the sweep if its time is up."""
        if self._due is not None and self.world.time_s >= self._due:
            self._end_sweep()

    def _end_sweep(self) -> None:
        self._due = None
        self.status.operation.put(_SWEEPING, False)
        f_hz, averages = self.grid(), self.averages if self.averaging else 1
        try:
            m = self.readings.read(f_hz, self.bandwidth, self.power, averages, self.output)
        except ScpiError as error:
            self.status.report(error)
            return
        into = self.power + 20 * np.log10(np.max(np.abs(m)) + 1e-30)
        self.status.questionable.put(_OVERLOADED, bool(self.output and into > _OVERLOAD_DBM))
        self._result = f_hz, m

    def _abort(self) -> None:
        self._due = None
        self.status.operation.put(_SWEEPING, False)

    def _poll(self) -> str:
        """Give the conditions; asking takes time too, so that a poll always comes to an end."""
        if self._due is not None:
            self.world.advance(max(1e-3, 0.02 * self.sweep_s))
            self.refresh()
        return str(self.status.operation.condition)

    # -- commands ----------------------------------------------------------------------------------------

    def _value(
        self,
        name: str,
        low: float,
        high: float,
        suffixes: dict[str, float] | None = None,
        whole: bool = False,
    ) -> Command:
        def put(parameters: tuple[str, ...]) -> None:
            value = number(parameters[0], low, high, suffixes)
            setattr(self, name, round(value) if whole else value)
            self._result = None

        def get(parameters: tuple[str, ...]) -> str:
            value = number(parameters[0], low, high, suffixes) if parameters else getattr(self, name)
            return str(round(value)) if whole else f"{value:.15G}"

        return Command(put, get, 1, 1)

    def _word(self, name: str, *keywords: str) -> Command:
        def put(parameters: tuple[str, ...]) -> None:
            setattr(self, name, choice(parameters[0], *keywords))
            self._result = None

        return Command(put, lambda _: "".join(c for c in getattr(self, name) if c.isupper()), 1, 1)

    def _switch(self, name: str) -> Command:
        def put(parameters: tuple[str, ...]) -> None:
            setattr(self, name, boolean(parameters[0]))

        return Command(put, lambda _: str(int(getattr(self, name))), 1, 1)

    def _add_sweep(self) -> None:
        add = self.tree.add
        add("[SENSe]:FREQuency:STARt", self._value("start", _LOW_HZ, _HIGH_HZ, FREQUENCY))
        add("[SENSe]:FREQuency:STOP", self._value("stop", _LOW_HZ, _HIGH_HZ, FREQUENCY))
        add(
            "[SENSe]:FREQuency:CENTer",
            Command(self._set_centre, lambda _: f"{(self.start + self.stop) / 2:.15G}", 1, 1),
        )
        add(
            "[SENSe]:FREQuency:SPAN",
            Command(self._set_span, lambda _: f"{self.stop - self.start:.15G}", 1, 1),
        )
        add("[SENSe]:FREQuency:MODE", self._word("mode", "SWEep", "LIST"))
        add("[SENSe]:SWEep:POINts", self._value("points", 2, _MOST_POINTS, None, whole=True))
        add("[SENSe]:SWEep:SPACing", self._word("spacing", "LINear", "LOGarithmic"))
        add("[SENSe]:SWEep:TIME", Command(get=lambda _: f"{self.sweep_s:.9G}"))
        add(
            "[SENSe]:LIST:FREQuency",
            Command(self._set_list, lambda _: ",".join(map(repr, self.listed)), 2, _MOST_POINTS),
        )
        for keyword in ("BANDwidth", "BWIDth"):
            add(f"[SENSe]:{keyword}[:RESolution]", self._value("bandwidth", 1.0, 1e6, FREQUENCY))
        add("[SENSe]:AVERage[:STATe]", self._switch("averaging"))
        add("[SENSe]:AVERage:COUNt", self._value("averages", 1, 65536, None, whole=True))
        add("INITiate:CONTinuous", self._switch("continuous"))
        add("INITiate[:IMMediate][:ALL]", Command(lambda _: self._initiate()))
        add("ABORt", Command(lambda _: self._abort()))
        add("TRIGger[:SEQuence]:SOURce", self._word("trigger", "IMMediate", "BUS", "EXTernal"))
        add("STATus:OPERation:CONDition", Command(get=lambda _: self._poll()))

    def _add_source_and_format(self) -> None:
        add = self.tree.add
        add("SOURce:POWer[:LEVel][:IMMediate][:AMPLitude]", self._value("power", -60.0, 15.0, POWER))
        add("OUTPut[:STATe]", self._switch("output"))
        add("FORMat[:DATA]", Command(self._set_format, lambda _: self._format(), 1, 2))
        add("FORMat:BORDer", self._word("border", "NORMal", "SWAPped"))

    def _add_reading(self) -> None:
        self.tree.add("TRACe[:DATA]", Command(get=self._trace))
        self.tree.add(
            "CALCulate:FEED",
            Command(self._set_feed, lambda _: f'"XFRequency:RATio {self.feed[0]},{self.feed[1]}"', 1, 1),
        )
        self.tree.add(
            "CALCulate:DATA", Command(get=lambda _: self._encode(self._pairs(self._plane(*self.feed))))
        )

    def _set_centre(self, parameters: tuple[str, ...]) -> None:
        centre, half = number(parameters[0], _LOW_HZ, _HIGH_HZ, FREQUENCY), (self.stop - self.start) / 2
        half = min(half, centre - _LOW_HZ, _HIGH_HZ - centre)
        self.start, self.stop = centre - half, centre + half

    def _set_span(self, parameters: tuple[str, ...]) -> None:
        span, centre = number(parameters[0], 0.0, _HIGH_HZ - _LOW_HZ, FREQUENCY), (self.start + self.stop) / 2
        self.start, self.stop = max(centre - span / 2, _LOW_HZ), min(centre + span / 2, _HIGH_HZ)

    def _set_list(self, parameters: tuple[str, ...]) -> None:
        listed = numbers(parameters, _LOW_HZ, _HIGH_HZ, FREQUENCY)
        if any(b <= a for a, b in itertools.pairwise(listed)):
            raise ScpiError(-221, "frequencies do not increase")
        self.listed, self.points = listed, len(listed)

    def _set_format(self, parameters: tuple[str, ...]) -> None:
        kind = choice(parameters[0], "ASCii", "REAL")
        if kind == "REAL":
            size = round(number(parameters[1], 32, 64)) if len(parameters) > 1 else 64
            if size not in (32, 64):
                raise ScpiError(-224, parameters[1])
            kind = f"REAL,{size}"
        self.form = kind

    def _format(self) -> str:
        return "ASC,0" if self.form == "ASCii" else self.form

    def _set_feed(self, parameters: tuple[str, ...]) -> None:
        words = string(parameters[0]).replace(":", " ").replace(",", " ").split()
        if len(words) != 4 or [words[0].upper(), words[1].upper()] not in (
            ["XFREQUENCY", "RATIO"],
            ["XFR", "RAT"],
        ):
            raise ScpiError(-224, parameters[0][:40])
        receiver, source = (round(number(w, 1, 2)) for w in words[2:])
        self.feed = receiver, source

    # -- answers -----------------------------------------------------------------------------------------

    def _measured(self) -> tuple[Real, Matrix]:
        self.finish()
        if self._result is None:
            raise ScpiError(-230)
        return self._result

    def _plane(self, receiver: int, source: int) -> np.ndarray[tuple[int], np.dtype[np.complex128]]:
        return self._measured()[1][:, receiver - 1, source - 1]

    def _trace(self, parameters: tuple[str, ...]) -> bytes | str:
        if not parameters:
            raise ScpiError(-109)
        name = parameters[0].strip("\"'").upper()
        if name == "GRID":
            return self._encode(self._measured()[0])
        if name == "MATRIX":
            m = self._measured()[1]
            rows = np.stack(
                [self._pairs(m[:, i, j]).reshape(-1, 2) for i, j in ((0, 0), (1, 0), (0, 1), (1, 1))], 1
            )
            return self._encode(rows.ravel())
        raise ScpiError(-224, name[:40])

    @staticmethod
    def _pairs(plane: np.ndarray[tuple[int], np.dtype[np.complex128]]) -> Real:
        return np.ascontiguousarray(plane).view(np.float64)

    def _encode(self, values: Real) -> bytes | str:
        if self.form == "ASCii":
            return ",".join(f"{v:+.16E}" for v in values.tolist())
        order = "<" if self.border == "SWAPped" else ">"
        data = values.astype(f"{order}f{int(self.form[-2:]) // 8}").tobytes()
        length = str(len(data))
        return b"#" + str(len(length)).encode() + length.encode() + data
