"""Instruments beside the network analyzer, by kind; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.instruments.canned import Canned
from sim_instruments.instruments.generator import Generator
from sim_instruments.instruments.power_meter import PowerMeter
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.spectrum import SpectrumAnalyzer
from sim_instruments.instruments.supply import Supply
from sim_instruments.instruments.switch import Switch
from sim_instruments.instruments.thermometer import Thermometer
from sim_instruments.scpi.instrument import Instrument

__all__ = ["KINDS"]

KINDS: Mapping[
    str, Callable[[WiredWorld, tuple[str, str, str, str], Mapping[str, Any], Draws], Instrument]
] = {
    "signal generator": Generator,
    "spectrum analyzer": SpectrumAnalyzer,
    "power meter": PowerMeter,
    "supply": Supply,
    "switch matrix": Switch,
    "thermometer": Thermometer,
    "pyvisa-sim": Canned,
}
"""Each takes the world, the four fields of its identity, its description in the bench file, and its draws."""
