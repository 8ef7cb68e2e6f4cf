"""Power meter and thermometer."""

from __future__ import annotations

import math

import pytest

METER = {
    "kind": "power meter", "ports": [4], "match": 80, "limits": {"frequency": [1e6, 6e9], "power": [-30, 20]},
    "calibration": 0.6, "calibration error": 0, "zero": 0, "noise": 1e-12,
}  # fmt: skip


@pytest.fixture
def meter(make_bench, generator):
    """A meter with a generator on the other end of a thru."""
    bench = make_bench()
    source, client = bench.add(generator), bench.add(METER)
    bench.world.connect([(["thru"], [3, 4])])
    client.source = source
    return client


def test_it_reads_the_generator(meter) -> None:
    """READ? and MEASure? initiate, FETCh? repeats; a reading takes its time."""
    meter.source.write("FREQ 3 GHZ;:POW -3;:OUTP ON")
    meter.write("FREQ 3 GHZ")
    before = meter.instrument.world.time_s
    assert meter.number("READ?") == pytest.approx(-3.0, abs=0.01)
    assert meter.instrument.world.time_s - before == pytest.approx(4 * 0.05)
    assert meter.ask("FETC?") == meter.ask("FETCh:SCALar:POWer:AC?")
    assert meter.number("MEAS:POW?") == pytest.approx(-3.0, abs=0.01)
    assert meter.errors() == []


def test_in_watt(meter) -> None:
    """0 dBm is a milliwatt."""
    meter.source.write("FREQ 50 MHZ;:POW 0;:OUTP ON")
    meter.write("UNIT:POW W")
    assert meter.number("READ?") == pytest.approx(1e-3, rel=1e-2)
    assert meter.ask("UNIT:POW?") == "W"


def test_the_wrong_calibration_factor(meter) -> None:
    """The head falls off by 0.6 dB to 6 GHz: left at 0 Hz's factor, 3 GHz read 0.3 dB low."""
    meter.source.write("FREQ 3 GHZ;:POW 0;:OUTP ON")
    meter.write("FREQ 3 GHZ")
    right = meter.number("READ?")
    meter.write("FREQ MIN")
    assert right - meter.number("READ?") == pytest.approx(0.3, abs=0.01)


def test_it_reads_all_that_arrives(make_bench, generator) -> None:
    """Two tones of equal level: 3.01 dB more than one."""
    bench = make_bench()
    sources = [bench.add(generator), bench.add(generator)]
    client = bench.add(METER, calibration=0)
    bench.world.connect([(["thru"], [3, 4])])
    sources[0].write("FREQ 100 MHZ;:POW 0;:OUTP ON")
    one = client.number("READ?")
    sources[1].write("FREQ 200 MHZ;:POW 0;:OUTP ON")
    assert client.number("READ?") - one == pytest.approx(10 * math.log10(2), abs=0.01)


def test_too_much_power_is_no_number(meter) -> None:
    """9.91E37 (SCPI-1999's not a number) and bit 3 of QUEStionable."""
    meter.instrument._ends_dbm = (-30.0, -10.0)
    meter.source.write("POW 0;:OUTP ON")
    assert meter.number("READ?") == 9.91e37
    assert int(meter.ask("STAT:QUES:COND?")) & 8


def test_zeroing_takes_the_offset_out_and_wants_silence(make_bench, generator) -> None:
    """-340 while power arrives; some nanowatt before, picowatt after."""
    bench = make_bench()
    source, client = bench.add(generator), bench.add(METER, zero=1e-7)
    bench.world.connect([(["thru"], [3, 4])])
    client.write("UNIT:POW W")
    before = abs(client.number("READ?"))
    source.write("POW 0;:OUTP ON")
    assert client.errors("CAL:ZERO:AUTO ONCE") == [-340]
    source.write("OUTP OFF")
    assert client.errors("CAL:ZERO:AUTO ONCE") == []
    assert abs(client.number("READ?")) < before / 100


@pytest.mark.parametrize(
    ("message", "number"),
    [("FETC?", -230), ("FREQ 7 GHZ", -222), ("UNIT:POW VOLT", -224), ("AVER:COUN 0", -222),
     ("TRIG:SOUR BUS;:READ?", -214), ("INIT;:INIT", -213)],
)  # fmt: skip
def test_what_the_meter_refuses(meter, message: str, number: int) -> None:
    """With the standard's number."""
    assert meter.errors(message) == [number]


def test_after_a_refused_read_it_reads_again(meter) -> None:
    """Nothing is left armed."""
    meter.errors("TRIG:SOUR BUS;:READ?")
    assert meter.errors("TRIG:SOUR IMM;:READ?") == []


@pytest.fixture
def thermometer(make_bench):
    return make_bench().add({"kind": "thermometer", "error": 0})


def test_the_room(thermometer) -> None:
    """Within its resolution, in three units, at the cost of a fifth of a second."""
    world = thermometer.instrument.world
    before = world.time_s
    celsius = thermometer.number("MEAS:TEMP?")
    assert celsius == pytest.approx(world.temperature(), abs=0.006)
    assert world.time_s - before == pytest.approx(0.2)
    for unit, expected in (("K", celsius + 273.15), ("F", celsius * 9 / 5 + 32), ("CEL", celsius)):
        thermometer.write(f"UNIT:TEMP {unit}")
        assert thermometer.number("FETC?") == pytest.approx(expected, abs=1e-6)


def test_it_follows_the_room(thermometer) -> None:
    """A step of 6 K after ten minutes."""
    before = thermometer.number("READ?")
    world = thermometer.instrument.world
    world.step_temperature(6.0)
    world.advance(600.0)
    assert thermometer.number("READ?") - before == pytest.approx(6.0, abs=0.7)


def test_nothing_to_fetch(thermometer) -> None:
    """-230 before the first reading and after a reset."""
    assert thermometer.errors("FETC?") == [-230]
    assert thermometer.errors("READ?;*RST;FETC?") == [-230]
