"""The analyzer's commands: which header sets and asks for what."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from sim_instruments.scpi.element import kind_of
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.parameters import (
    FREQUENCY,
    POWER,
    boolean,
    choice,
    number,
    numbers,
    short,
    string,
    whole,
)
from sim_instruments.scpi.tree import Command
from sim_instruments.waves import Real

if TYPE_CHECKING:
    from sim_instruments.instruments.analyzer import Analyzer

__all__ = ["add_commands"]

Parameters = tuple[str, ...]
_TRACES = ("GRID", "MATRIX", "SWITCH")
_PLANES = ((0, 0), (1, 0), (0, 1), (1, 1))


def add_commands(analyzer: Analyzer) -> None:
    """Teach an analyzer its commands."""
    front = _Front(analyzer)
    front.add_sweep()
    front.add_trigger()
    front.add_source_and_format()
    front.add_reading()


class _Front:
    def __init__(self, analyzer: Analyzer) -> None:
        self.analyzer = analyzer
        self.add = analyzer.tree.add

    # -- kinds of settings -------------------------------------------------------------------------------

    def _number(
        self,
        write: Callable[[float], None],
        read: Callable[[], float],
        low: float,
        high: float,
        suffixes: dict[str, float] | None,
        default: float,
    ) -> Command:
        nearest = self.analyzer.manners.beyond_limits == "nearest"

        def put(parameters: Parameters) -> None:
            self.analyzer.may_change()
            try:
                value = number(parameters[0], low, high, suffixes, default)
            except ScpiError as error:
                if error.number != -222 or not nearest:
                    raise
                self.analyzer.status.report(error)
                value = min(max(number(parameters[0], -np.inf, np.inf, suffixes), low), high)
            write(value)
            self.analyzer.changed()

        def get(parameters: Parameters) -> str:
            if parameters and kind_of(parameters[0]) != "word":
                raise ScpiError(-108, parameters[0][:40])
            return f"{number(parameters[0], low, high, None, default) if parameters else read():.15G}"

        return Command(put, get, 1, 1, asks_most=1)

    def _setting(
        self, name: str, low: float, high: float, suffixes: dict[str, float] | None = None
    ) -> Command:
        default = float(getattr(self.analyzer, name))  # made right after a reset
        return self._number(
            lambda value: setattr(self.analyzer, name, value),
            lambda: float(getattr(self.analyzer, name)),
            low, high, suffixes, default,
        )  # fmt: skip

    def _count(self, name: str, low: int, high: int) -> Command:
        default = int(getattr(self.analyzer, name))

        def put(parameters: Parameters) -> None:
            self.analyzer.may_change()
            setattr(self.analyzer, name, whole(parameters[0], low, high, default))
            self.analyzer.changed()

        def get(parameters: Parameters) -> str:
            if parameters and kind_of(parameters[0]) != "word":
                raise ScpiError(-108, parameters[0][:40])
            return str(
                whole(parameters[0], low, high, default) if parameters else getattr(self.analyzer, name)
            )

        return Command(put, get, 1, 1, asks_most=1)

    def _word(self, name: str, *keywords: str, sweeps: bool = True) -> Command:
        def put(parameters: Parameters) -> None:
            if sweeps:
                self.analyzer.may_change()
            setattr(self.analyzer, name, choice(parameters[0], *keywords))
            if sweeps:
                self.analyzer.changed()

        return Command(put, lambda _: short(getattr(self.analyzer, name)), 1, 1)

    def _switch(self, name: str, write: Callable[[bool], None]) -> Command:
        return Command(
            lambda parameters: write(boolean(parameters[0])),
            lambda _: str(int(getattr(self.analyzer, name))), 1, 1,
        )  # fmt: skip

    # -- the tree ----------------------------------------------------------------------------------------

    def add_sweep(self) -> None:
        a, add = self.analyzer, self.add
        low, high = a.limits.frequency
        add("[SENSe]:FREQuency:STARt", self._setting("start", low, high, FREQUENCY))
        add("[SENSe]:FREQuency:STOP", self._setting("stop", low, high, FREQUENCY))
        centre, span = (low + high) / 2, high - low
        add("[SENSe]:FREQuency:CENTer", self._number(
            self._set_centre, lambda: (a.start + a.stop) / 2, low, high, FREQUENCY, centre))  # fmt: skip
        add("[SENSe]:FREQuency:SPAN", self._number(
            self._set_span, lambda: a.stop - a.start, 0.0, span, FREQUENCY, span))  # fmt: skip
        add("[SENSe]:FREQuency[:CW]", self._setting("fixed", low, high, FREQUENCY))
        add("[SENSe]:FREQuency:SPAN:FULL", Command(lambda _: self._set_full()))
        add("[SENSe]:FREQuency:MODE", self._word("mode", "SWEep", "LIST"))
        add("[SENSe]:SWEep:POINts", self._count("points", 2, a.limits.points))
        add("[SENSe]:SWEep:SPACing", self._word("spacing", "LINear", "LOGarithmic"))
        add("[SENSe]:SWEep:TIME", Command(get=lambda _: f"{a.sweep_s:.9G}"))
        add("[SENSe]:LIST:FREQuency", Command(
            self._set_list, lambda _: ",".join(map(repr, a.listed)), 2, a.limits.points))  # fmt: skip
        add("[SENSe]:LIST:FREQuency:POINts", Command(get=lambda _: str(len(a.listed))))
        bandwidth = self._number(
            self._set_bandwidth, lambda: a.bandwidth, *a.limits.bandwidth, FREQUENCY, a.bandwidth
        )
        for keyword in ("BANDwidth", "BWIDth"):
            add(f"[SENSe]:{keyword}[:RESolution]", bandwidth)
        add("[SENSe]:AVERage[:STATe]", self._switch("averaging", self._set_averaging))
        add("[SENSe]:AVERage:COUNt", self._count("averages", 1, 65536))

    def add_trigger(self) -> None:
        a, add = self.analyzer, self.add
        add("INITiate:CONTinuous", self._switch("continuous", a.set_continuous))
        add("INITiate[:IMMediate][:ALL]", Command(lambda _: a.initiate()))
        add("ABORt", Command(lambda _: a.abort()))
        add("TRIGger[:SEQuence]:SOURce", Command(
            lambda p: a.set_trigger(choice(p[0], "IMMediate", "BUS", "EXTernal")),
            lambda _: short(a.trigger), 1, 1))  # fmt: skip

    def add_source_and_format(self) -> None:
        a, add = self.analyzer, self.add
        add("SOURce:POWer[:LEVel][:IMMediate][:AMPLitude]", self._setting("power", *a.limits.power, POWER))
        add("SOURce:POWer:MODE", self._word("power_mode", "FIXed", "SWEep"))
        add("SOURce:POWer:STARt", self._setting("power_start", *a.limits.power, POWER))
        add("SOURce:POWer:STOP", self._setting("power_stop", *a.limits.power, POWER))
        add("OUTPut[:STATe]", self._switch("output", lambda on: setattr(a, "output", on)))
        add("FORMat[:DATA]", Command(self._set_format, lambda _: self._format(), 1, 2))
        add("FORMat:BORDer", self._word("border", "NORMal", "SWAPped", sweeps=False))

    def add_reading(self) -> None:
        a, add = self.analyzer, self.add
        add("TRACe[:DATA]", Command(get=self._trace, asks_least=1, asks_most=1, measures=True))
        add("TRACe:CATalog", Command(get=lambda _: ",".join(f'"{name}"' for name in _TRACES)))
        add("TRACe:POINts", Command(get=self._trace_points, asks_least=1, asks_most=1, measures=True))
        add("CALCulate:FEED", Command(
            self._set_feed, lambda _: f'"XFRequency:RATio {a.feed[0]},{a.feed[1]}"', 1, 1))  # fmt: skip
        add("CALCulate:DATA", Command(get=self._selected, measures=True))

    # -- settings ----------------------------------------------------------------------------------------

    def _set_centre(self, centre: float) -> None:
        a = self.analyzer
        half = min((a.stop - a.start) / 2, centre - a.limits.frequency[0], a.limits.frequency[1] - centre)
        a.start, a.stop = centre - half, centre + half

    def _set_span(self, span: float) -> None:
        a = self.analyzer
        centre = (a.start + a.stop) / 2
        a.start = max(centre - span / 2, a.limits.frequency[0])
        a.stop = min(centre + span / 2, a.limits.frequency[1])

    def _set_full(self) -> None:
        a = self.analyzer
        a.may_change()
        a.start, a.stop = a.limits.frequency
        a.changed()

    def _set_bandwidth(self, bandwidth: float) -> None:
        a = self.analyzer
        a.bandwidth = a.manners.bandwidth(bandwidth)

    def _set_averaging(self, on: bool) -> None:
        self.analyzer.may_change()
        self.analyzer.averaging = on
        self.analyzer.changed()

    def _set_list(self, parameters: Parameters) -> None:
        a = self.analyzer
        a.may_change()
        listed = numbers(parameters, *a.limits.frequency, FREQUENCY)
        if any(later <= sooner for sooner, later in itertools.pairwise(listed)):
            raise ScpiError(-221, "frequencies do not increase")
        a.listed, a.points = listed, len(listed)
        a.changed()

    def _set_format(self, parameters: Parameters) -> None:
        a = self.analyzer
        kind, length = choice(parameters[0], "ASCii", "REAL"), parameters[1:]
        if kind == "REAL":
            size = whole(length[0], 0, 1 << 15) if length else 64
            if size not in (32, 64):
                raise ScpiError(-224, length[0][:40])
            a.form = f"REAL,{size}"
        else:
            a.form, a.digits = "ASCii", whole(length[0], 0, 17) if length else 0

    def _format(self) -> str:
        return f"ASC,{self.analyzer.digits}" if self.analyzer.form == "ASCii" else self.analyzer.form

    def _set_feed(self, parameters: Parameters) -> None:
        words = string(parameters[0]).replace(":", " ").replace(",", " ").split()
        if len(words) != 4 or [words[0].upper(), words[1].upper()] not in (
            ["XFREQUENCY", "RATIO"], ["XFR", "RAT"],
        ):  # fmt: skip
            raise ScpiError(-224, parameters[0][:40])
        if any(word not in ("1", "2") for word in words[2:]):
            raise ScpiError(-224, f"ports {words[2]},{words[3]}"[:40])
        self.analyzer.feed = int(words[2]), int(words[3])

    # -- answers -----------------------------------------------------------------------------------------

    def _selected(self, _: Parameters) -> bytes | str:
        receiver, source = self.analyzer.feed
        plane = self.analyzer.measured()[1][:, receiver - 1, source - 1]
        return self._encode(np.ascontiguousarray(plane).view(np.float64))

    def _name(self, parameters: Parameters) -> str:
        quoted = kind_of(parameters[0]) == "string"
        name = (string(parameters[0]) if quoted else choice(parameters[0], *_TRACES)).upper()
        if name not in _TRACES:
            raise ScpiError(-224, name[:40])
        return name

    def _trace_points(self, parameters: Parameters) -> str:
        self._name(parameters)
        return str(len(self.analyzer.measured()[0]))

    def _trace(self, parameters: Parameters) -> bytes | str:
        name = self._name(parameters)
        grid, m = self.analyzer.measured()
        if name == "GRID":
            return self._encode(grid)
        if name == "SWITCH":
            return self._encode(np.ascontiguousarray(self.analyzer.switch_terms()).view(np.float64).ravel())
        rows = np.empty((len(m), 4), np.complex128)
        for column, (receiver, source) in enumerate(_PLANES):
            rows[:, column] = m[:, receiver, source]
        return self._encode(rows.view(np.float64).ravel())

    def _encode(self, values: Real) -> bytes | str:
        a = self.analyzer
        if a.form == "ASCii":
            digits = (a.digits or 17) - 1
            return ",".join([f"{v:+.{digits}E}" for v in values.tolist()])
        order = "<" if a.border == "SWAPped" else ">"
        data = values.astype(f"{order}f{int(a.form[-2:]) // 8}").tobytes()
        length = str(len(data))
        return b"#" + str(len(length)).encode() + length.encode() + data
