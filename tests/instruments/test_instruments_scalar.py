"""Drivers of generator, spectrum analyzer and supply over the simulated amplifier bench; their dialects."""

from __future__ import annotations

import pytest
import pyvisa

from benchrun.clock import FunctionClock
from benchrun.errors import InputError, InstrumentError, InvalidMeasurement
from benchrun.instruments.generator import SignalGenerator
from benchrun.instruments.scalar_dialects import (
    load_generator_dialect,
    load_spectrum_dialect,
    load_supply_dialect,
)
from benchrun.instruments.spectrum import SpectrumAnalyzer
from benchrun.instruments.supply import Supply
from benchrun.scpi.opening import open_session
from benchrun.scpi.transcript import Transcript
from sim_instruments.bench import load_bench
from sim_instruments.doors.visa import simulated_visa
from sim_instruments.faults import inject


class Workplace:
    def __init__(self, *faults: str) -> None:
        bench = load_bench("amplifier", 1)
        for fault in faults:
            bench = inject(bench, fault)
        self.world, self.instruments = bench.world, bench.instruments
        world = bench.world
        clock = FunctionClock(lambda: world.time_s, world.advance)
        manager = pyvisa.ResourceManager(simulated_visa(world, bench.instruments))

        def session(address: int):
            return open_session(manager, f"GPIB0::{address}::INSTR", clock, Transcript())

        self.generator = SignalGenerator(session(20), load_generator_dialect("standard-generator"))
        self.spectrum = SpectrumAnalyzer(session(22), load_spectrum_dialect("standard-spectrum"), 30.0)
        self.supply = Supply(session(5), load_supply_dialect("standard-supply"))
        for one in (self.generator, self.spectrum, self.supply):
            one.preset()


def test_a_tone_through_a_thru_is_read_at_its_level() -> None:
    """The generator's output is combined (3.4 dB) before its port, as the bench file says."""
    place = Workplace()
    place.world.connect([(("thru",), (3, 4))])
    place.generator.tone(169.4e6, -10.0)
    assert place.spectrum.level(169.4e6, 10e3, -5.0) == pytest.approx(-13.4, abs=1.0)
    place.generator.off()
    assert place.spectrum.level(169.4e6, 10e3, -5.0) < -80.0


def test_a_unit_works_only_on_its_supply() -> None:
    place = Workplace()
    place.world.offer("DA-0001")
    place.world.connect([(("unit",), (3, 4))])
    place.generator.tone(169.4e6, -20.0)
    dead = place.spectrum.level(169.4e6, 10e3, 0.0)
    drawn = place.supply.feed(5.0, 0.15)
    assert place.spectrum.level(169.4e6, 10e3, 0.0) > dead + 30.0
    assert drawn == pytest.approx(0.082, abs=0.01)
    place.supply.off()
    assert not place.supply.on


def test_a_tripped_supply_is_no_measurement_and_leaves_nothing_on() -> None:
    place = Workplace()
    place.world.offer("DA-0001")
    place.world.connect([(("unit",), (3, 4))])
    with pytest.raises(InvalidMeasurement, match=r"tripped: the unit draws more than 0\.02 A at 5 V"):
        place.supply.feed(5.0, 0.02)
    assert place.supply.make_safe() == ""
    assert not place.instruments["GPIB0::5::INSTR"].output


def test_an_overload_and_an_open_reference_are_no_measurement() -> None:
    place = Workplace("overload")
    place.world.connect([(("thru",), (3, 4))])
    place.generator.tone(169.4e6, -10.0)
    with pytest.raises(InvalidMeasurement, match=r"reports an overload near 169\.4 MHz"):
        place.spectrum.level(169.4e6, 10e3, 0.0)
    place = Workplace("unlock")
    place.world.connect([(("thru",), (3, 4))])
    place.generator.tone(169.4e6, -10.0)
    with pytest.raises(InvalidMeasurement, match="reports an unlocked reference"):
        place.spectrum.level(169.4e6, 10e3, 0.0)
    with pytest.raises(InvalidMeasurement, match="reports an unlocked reference"):
        place.generator.check()


def test_what_an_instrument_refuses_is_told_with_the_request() -> None:
    place = Workplace()
    with pytest.raises(InstrumentError, match=r"GPIB0::22::INSTR after 'SENSe:FREQuency:CENTer") as caught:
        place.spectrum.level(60e9, 10e3, 0.0)
    assert caught.value.number == -222


def test_the_range_is_never_set_beyond_what_it_can() -> None:
    place = Workplace()
    place.spectrum.level(169.4e6, 10e3, 99.0)  # 30 dBm at most, by the bench file


@pytest.mark.parametrize(
    ("load", "name"),
    [
        (load_generator_dialect, "standard-generater"),
        (load_spectrum_dialect, "standard-spectrun"),
        (load_supply_dialect, "standard-suply"),
    ],
)
def test_a_dialect_that_is_not_there_is_told_with_the_nearest(load, name: str) -> None:
    with pytest.raises(InputError, match="Did you mean 'standard-"):
        load(name)
