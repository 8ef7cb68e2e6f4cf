"""The spectrum analyzer's settings, which hang together, and its commands."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from sim_instruments.instruments.manners import Manners
from sim_instruments.instruments.settings import Settings, allowed, chosen, limit
from sim_instruments.scpi.element import kind_of
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.parameters import FREQUENCY, POWER, TIME, choice, string
from sim_instruments.scpi.tree import Command
from sim_instruments.values import number

if TYPE_CHECKING:
    from sim_instruments.instruments.spectrum import SpectrumAnalyzer

__all__ = ["Coupled", "add_commands"]

Parameters = tuple[str, ...]
_DECIBEL = {"DB": 1.0}
_SHARE = 0.01
"""Resolution bandwidth over span where the two are coupled."""
_SLOW = 2.5
"""Sweep time times bandwidths over span at which the filter rings up to within 0.1 dB (common practice: 2 to
3)."""
_POINT_S = 20e-6


class Coupled:
    """Frequencies, bandwidths, attenuation, reference level and time, as far as they follow each other.

    Parameters
    ----------
    spec
        The instrument's ``limits`` and ``manners``.
    """

    def __init__(self, spec: Mapping[str, Any]) -> None:
        limits, manners = spec.get("limits", {}), dict(spec.get("manners", {}))
        allowed(
            "limits", limits, "frequency", "bandwidth", "points", "reference", "attenuation",
            "attenuation step",
        )  # fmt: skip
        for own in ("reference", "trace", "numbers"):
            manners.pop(own, None)
        self.manners = Manners.read(manners)
        self.ends_hz = limit(spec, "frequency", 9e3, 6e9)
        self.ends_bandwidth = limit(spec, "bandwidth", 10.0, 5e6)
        self.ends_reference = limit(spec, "reference", -100.0, 30.0)
        self.most_points = int(limits.get("points", 10_001))
        if self.most_points < 2:
            raise ValueError(f"limits of points: {self.most_points}; a sweep has two at least")
        self.most_db, self.step_db = (
            number(limits.get("attenuation", 50.0)), number(limits.get("attenuation step", 10.0))
        )  # fmt: skip
        self.reset()

    def reset(self) -> None:
        """Full span, everything coupled, reference at 0 dBm."""
        self.start, self.stop = self.ends_hz
        self.reference = 0.0
        self.auto_resolution = self.auto_video = self.auto_attenuation = self.auto_time = True
        self._resolution = self._video = self._time = self._attenuation = 0.0

    @property
    def span(self) -> float:
        """In Hz; 0 stands at one frequency."""
        return self.stop - self.start

    @property
    def resolution(self) -> float:
        """3 dB bandwidth of the resolution filter, in Hz."""
        return self._step(_SHARE * self.span) if self.auto_resolution else self._resolution

    @resolution.setter
    def resolution(self, value: float) -> None:
        self._resolution, self.auto_resolution = self.manners.bandwidth(value), False

    @property
    def video(self) -> float:
        """Bandwidth of the video filter, in Hz."""
        return self.resolution if self.auto_video else self._video

    @video.setter
    def video(self, value: float) -> None:
        self._video, self.auto_video = self.manners.bandwidth(value), False

    def _step(self, value: float) -> float:
        """Nearest bandwidth that there is."""
        low, high = self.ends_bandwidth
        wanted = min(max(value, low), high)
        steps = [m * 10.0**d for d in range(-1, 9) for m in self.manners.steps]
        fitting = [step for step in steps if low <= step <= high]
        return min(fitting, key=lambda step: abs(math.log(step / wanted))) if fitting else wanted

    @property
    def attenuation(self) -> float:
        """In dB; coupled: a signal at the reference level meets the mixer at -10 dBm or less."""
        if not self.auto_attenuation:
            return self._attenuation
        wanted = math.ceil((self.reference + 10.0) / self.step_db - 1e-9) * self.step_db
        return min(max(wanted, 0.0), self.most_db)

    @attenuation.setter
    def attenuation(self, value: float) -> None:
        self._attenuation, self.auto_attenuation = round(value / self.step_db) * self.step_db, False

    def _least_s(self, points: int) -> float:
        width = self.resolution * min(self.resolution, self.video)
        slow = _SLOW * self.span / width if self.span else 3.0 * points / min(self.resolution, self.video)
        return max(slow, _POINT_S * points)

    def sweep_s(self, points: int) -> float:
        """Seconds of a sweep: as span over the square of the bandwidth, unless it was set."""
        return self._least_s(points) if self.auto_time else max(self._time, _POINT_S * points)

    def set_time(self, value: float) -> None:
        """A sweep time of one's own."""
        self._time, self.auto_time = value, False

    def too_fast_db(self, points: int) -> float:
        """What a tone loses because the filter has no time to ring up.

        ``(1 + 0.195 (span / (T B^2))^2)^(-1/4)`` of the amplitude, a Gaussian filter (from memory).
        """
        rate = self.span / (self.sweep_s(points) * self.resolution * min(self.resolution, self.video))
        return 0.0 if rate <= 1.0 / _SLOW + 1e-9 else 5.0 * math.log10(1 + 0.195 * rate**2)

    # -- frequencies -------------------------------------------------------------------------------------

    def set_start(self, f_hz: float) -> None:
        """STOP gives way."""
        self.start, self.stop = f_hz, max(f_hz, self.stop)

    def set_stop(self, f_hz: float) -> None:
        """STARt gives way."""
        self.start, self.stop = min(f_hz, self.start), f_hz

    def set_center(self, f_hz: float) -> None:
        """The span stays, or becomes what fits."""
        half = min(self.span / 2, f_hz - self.ends_hz[0], self.ends_hz[1] - f_hz)
        self.start, self.stop = f_hz - half, f_hz + half

    def set_span(self, span_hz: float) -> None:
        """The centre stays, as far as the range allows."""
        centre = (self.start + self.stop) / 2
        self.start = max(centre - span_hz / 2, self.ends_hz[0])
        self.stop = min(centre + span_hz / 2, self.ends_hz[1])


def add_commands(analyzer: SpectrumAnalyzer, manners: Mapping[str, Any]) -> None:
    """Teach a spectrum analyzer its commands, in the dialect of its manners."""
    c, tree = analyzer.coupled, analyzer.tree
    settings = Settings(
        analyzer, analyzer.may_change, analyzer.changed, c.manners.beyond_limits == "nearest",
        chosen("manners", manners, "numbers", "plain", "scientific") == "scientific",
    )  # fmt: skip
    low, high = c.ends_hz

    def coupled(name: str, ends: tuple[float, float], suffixes: dict[str, float]) -> Command:
        return settings.number(
            name, ends, suffixes, lambda value: setattr(c, name, value), lambda: float(getattr(c, name))
        )

    def automatic(name: str, value: str) -> Command:
        def put(on: bool) -> None:
            if on:
                setattr(c, name, True)
            elif getattr(c, name):
                setattr(c, value, getattr(c, value))  # stays where it is

        switch = settings.switch(name, put)
        return Command(switch.set, lambda _: str(int(getattr(c, name))), 1, 1)

    for word, write, read in (
        ("STARt", c.set_start, lambda: c.start),
        ("STOP", c.set_stop, lambda: c.stop),
        ("CENTer", c.set_center, lambda: (c.start + c.stop) / 2),
    ):
        header = f"[SENSe]:FREQuency:{word}"
        tree.add(header, settings.number(word, (low, high), FREQUENCY, write, read))
    tree.add("[SENSe]:FREQuency:SPAN", settings.number(
        "span", (0.0, high - low), FREQUENCY, c.set_span, lambda: c.span))  # fmt: skip
    tree.add("[SENSe]:FREQuency:SPAN:FULL", Command(lambda _: _full(analyzer)))
    for keyword in ("BANDwidth", "BWIDth"):
        header = f"[SENSe]:{keyword}"
        tree.add(f"{header}[:RESolution]", coupled("resolution", c.ends_bandwidth, FREQUENCY))
        tree.add(f"{header}[:RESolution]:AUTO", automatic("auto_resolution", "resolution"))
        tree.add(f"{header}:VIDeo", coupled("video", c.ends_bandwidth, FREQUENCY))
        tree.add(f"{header}:VIDeo:AUTO", automatic("auto_video", "video"))
    tree.add("[SENSe]:DETector[:FUNCtion]", settings.word("detector", "POSitive", "SAMPle", "AVERage"))
    tree.add("[SENSe]:POWer[:AC]:ATTenuation", coupled("attenuation", (0.0, c.most_db), _DECIBEL))
    tree.add("[SENSe]:POWer[:AC]:ATTenuation:AUTO", automatic("auto_attenuation", "attenuation"))
    shown_as = chosen("manners", manners, "reference", "range", "display")
    tree.add(
        "[SENSe]:POWer[:AC]:RANGe[:UPPer]" if shown_as == "range"
        else "DISPlay[:WINDow]:TRACe:Y[:SCALe]:RLEVel",
        coupled("reference", c.ends_reference, POWER),
    )  # fmt: skip
    tree.add("[SENSe]:SWEep:POINts", settings.count("points", 2, c.most_points))
    tree.add("[SENSe]:SWEep:TIME", settings.number(
        "time", (1e-3, 1e6), TIME, c.set_time, lambda: analyzer.duration_s))  # fmt: skip

    def automatic_time(on: bool) -> None:
        if on:
            c.auto_time = True
        elif c.auto_time:
            c.set_time(analyzer.duration_s)

    tree.add("[SENSe]:SWEep:TIME:AUTO", Command(
        settings.switch("time", automatic_time).set, lambda _: str(int(c.auto_time)), 1, 1))  # fmt: skip
    analyzer.add_trigger_commands()
    analyzer.format.add_commands(analyzer)
    _add_traces(analyzer, chosen("manners", manners, "trace", "TRACE", "TRACE1"))


def _full(analyzer: SpectrumAnalyzer) -> None:
    analyzer.may_change()
    analyzer.coupled.start, analyzer.coupled.stop = analyzer.coupled.ends_hz
    analyzer.changed()


def _add_traces(analyzer: SpectrumAnalyzer, trace: str) -> None:
    def name(parameters: Parameters) -> str:
        if kind_of(parameters[0]) != "string":
            return choice(parameters[0], trace, "GRID")
        if (word := string(parameters[0]).upper()) not in (trace, "GRID"):
            raise ScpiError(-224, word[:40])
        return word

    def data(parameters: Parameters) -> bytes | str:
        if name(parameters) == "GRID":
            return analyzer.format.encode(analyzer.grid())
        analyzer.fetch()
        assert analyzer.trace is not None  # fetched
        return analyzer.format.encode(analyzer.trace)

    def points(parameters: Parameters) -> str:
        name(parameters)
        return str(analyzer.points)

    add = analyzer.tree.add
    add("TRACe[:DATA]", Command(get=data, asks_least=1, asks_most=1, measures=True))
    add("TRACe:POINts", Command(get=points, asks_least=1, asks_most=1))
    add("TRACe:CATalog", Command(get=lambda _: f'"{trace}","GRID"'))
