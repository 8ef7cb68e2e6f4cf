"""The amplifier's bench through PyVISA, as any program would use it."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import pyvisa

from sim_instruments.bench import BadBench, load_bench
from sim_instruments.doors.visa import simulated_visa

NAMES = {
    "generator": 19, "second": 20, "other generator": 21, "analyzer": 22, "other analyzer": 23, "supply": 5,
    "meter": 13, "switch": 9, "thermometer": 30,
}  # fmt: skip


class Desk:
    """Everything opened."""

    def __init__(self) -> None:
        self.bench = load_bench("amplifier", 1)
        self.world = self.bench.world
        self.manager = pyvisa.ResourceManager(simulated_visa(self.world, self.bench.instruments))
        for name, address in NAMES.items():
            resource = self.manager.open_resource(
                f"GPIB0::{address}::INSTR", read_termination="\n", write_termination="\n"
            )
            setattr(self, name.replace(" ", "_"), resource)

    def tone_dbm(self, f_hz: float) -> float:
        a = self.analyzer
        a.write(f"FREQ:CENT {f_hz};SPAN 100 KHZ;:BAND 1 KHZ;:POW:RANG 25;:SWE:POIN 101;:INIT;*OPC?")
        a.read()
        return float(max(a.query_ascii_values("TRAC? TRACE")))


@pytest.fixture
def desk():
    desk = Desk()
    yield desk
    desk.manager.close()


def test_every_instrument_says_that_it_is_simulated(desk) -> None:
    """And which model it is; errors there are none."""
    for name in NAMES:
        resource = getattr(desk, name.replace(" ", "_"))
        maker, model, serial, _ = resource.query("*IDN?").split(",")
        assert maker == "SIMULATED"
        assert model[0] in "SDPT"
        assert serial.startswith("S00")
        assert resource.query("SYST:ERR?") == '0,"No error"'
        assert resource.query("SYST:VERS?") == "1999.0"


def test_gain_of_the_good_and_the_bad_unit(desk) -> None:
    """A calibration of level through a thru, then the unit: within a quarter decibel of the truth."""
    desk.supply.write("VOLT 5 V;:CURR 0.2;:OUTP ON")
    desk.generator.write("FREQ 169 MHZ;:POW -20 DBM;:OUTP ON")
    desk.world.connect([(["thru"], [3, 4])])
    through = desk.tone_dbm(169e6)
    for serial in ("DA-0001", "DA-9001"):
        desk.world.offer(serial)
        desk.world.connect([(["unit"], [3, 4])])
        truth = 20 * np.log10(abs(desk.world.truth(np.array([169e6]))[0, 1, 0]))
        assert desk.tone_dbm(169e6) - through == pytest.approx(truth, abs=0.25)


def test_compression_tells_the_bad_unit(desk) -> None:
    """DA-9002 compresses 6 dB earlier."""
    desk.supply.write("VOLT 5 V;:CURR 0.2;:OUTP ON")
    desk.generator.write("FREQ 169 MHZ;:OUTP ON")
    lost = {}
    for serial in ("DA-0001", "DA-9002"):
        desk.world.offer(serial)
        desk.world.connect([(["unit"], [3, 4])])
        gains = []
        for level in (-20, 4):
            desk.generator.write(f"POW {level}")
            gains.append(desk.tone_dbm(169e6) - level)
        lost[serial] = gains[0] - gains[1]
    assert lost["DA-0001"] < 0.4
    assert lost["DA-9002"] > 1.0


def test_the_harmonic_filter_cleans_the_generator(desk) -> None:
    """The second harmonic goes down by the filter's rejection, the carrier hardly.

    With 50 dB of attenuation the analyzer's own harmonic stands 7 dB below what is left: up to 4 dB of error.
    """
    desk.generator.write("FREQ 169 MHZ;:POW 10;:OUTP ON")
    desk.world.connect([(["thru"], [3, 4])])
    carrier, harmonic = desk.tone_dbm(169e6), desk.tone_dbm(338e6)
    assert harmonic - carrier == pytest.approx(-35, abs=1.0)
    desk.world.offer("HF-0001")
    desk.world.connect([(["unit"], [3, 4])])
    truth = 20 * np.log10(abs(desk.world.truth(np.array([169e6, 338e6]))[:, 1, 0]))
    assert desk.tone_dbm(169e6) - carrier == pytest.approx(truth[0], abs=0.5)
    desk.analyzer.write("FREQ:CENT 338 MHZ;SPAN 1 KHZ;:BAND 30 HZ;:POW:ATT 50;:DET SAMP;:INIT;*OPC?")
    desk.analyzer.read()
    left = max(desk.analyzer.query_ascii_values("TRAC? TRACE"))
    assert left - harmonic == pytest.approx(truth[1], abs=4.0)


def test_two_generators_through_their_combiner(desk) -> None:
    """Third-order products stand 2 (IP3 - P) below the carriers."""
    desk.supply.write("VOLT 5 V;:CURR 0.2;:OUTP ON")
    desk.world.offer("DA-0001")
    desk.world.connect([(["unit"], [3, 4])])
    for source, f_mhz in ((desk.generator, 169), (desk.second, 170)):
        source.write(f"FREQ {f_mhz} MHZ;:POW -5;:OUTP ON")
    levels = [desk.tone_dbm(f * 1e6) for f in (168, 169, 170, 171)]
    assert levels[1] - levels[0] == pytest.approx(2 * (32 - levels[1]), abs=1.5)
    assert levels[2] - levels[3] == pytest.approx(2 * (32 - levels[2]), abs=1.5)


def test_meter_and_analyzer_agree_by_way_of_the_switch(desk) -> None:
    """The same level at two ports, without hands: within the errors of both."""
    desk.generator.write("FREQ 169 MHZ;:POW 5;:OUTP ON")
    desk.switch.write("ROUT:CLOS (@104)")
    desk.switch.query("*OPC?")
    seen = desk.tone_dbm(169e6)
    desk.switch.write("ROUT:OPEN:ALL;:ROUT:CLOS (@106)")
    desk.switch.query("*OPC?")
    desk.meter.write("FREQ 169 MHZ")
    assert float(desk.meter.query("READ?")) == pytest.approx(seen, abs=0.6)


def test_the_dialects_differ(desk) -> None:
    """What one takes the other refuses."""
    desk.generator.write("POW -20")
    assert desk.generator.query("SYST:ERR?") == '0,"No error"'
    desk.other_generator.write("POW -20")
    assert desk.other_generator.query("SYST:ERR?").startswith('-113,"Undefined header')
    desk.other_analyzer.write("POW:RANG -10")
    assert desk.other_analyzer.query("SYST:ERR?").startswith('-113,"Undefined header')
    desk.other_analyzer.write("DISP:TRAC:Y:RLEV -10 DBM;:FORM REAL,64;:INIT")
    values = desk.other_analyzer.query_binary_values(
        "TRAC? TRACE1", "d", is_big_endian=True, container=np.array
    )
    assert len(values) == 401


def test_a_seed_makes_one_bench() -> None:
    """The same trace for the same seed, noise and errors included; another for another."""
    traces = []
    for seed in (5, 5, 6):
        bench = load_bench("amplifier", seed)
        bench.world.connect([(["thru"], [3, 4])])
        for address, message in ((19, b"FREQ 169 MHZ;:POW 0;:OUTP ON\n"), (22, b"INIT;:TRAC? TRACE\n")):
            line = bench.instruments[f"GPIB0::{address}::INSTR"].line()
            line.receive(message)
            line.proceed()
        traces.append(line.take(1 << 30)[0])
    assert traces[0] == traces[1] != traces[2]


def test_the_network_analyzers_level_compresses_the_unit_too(desk) -> None:
    """By hand or by switch: less gain at a level near compression, from the front only."""
    desk.supply.write("VOLT 5 V;:CURR 0.2;:OUTP ON")
    desk.world.offer("DA-0001")
    f = np.array([169e6])

    def gain_db(power_dbm: float, driven: int = 1) -> float:
        return float(20 * np.log10(abs(desk.world.between_ports(f, power_dbm, driven)[0, 1, 0])))

    desk.world.connect([(["unit"], [1, 2])])
    by_hand = gain_db(-30.0) - gain_db(5.0)
    assert by_hand == pytest.approx(1.0, abs=0.25)
    assert gain_db(-30.0) == pytest.approx(gain_db(5.0, 2), abs=1e-3)
    desk.world.connect([])
    desk.switch.write("ROUT:CLOS (@101)")
    desk.switch.query("*OPC?")
    assert desk.world.has_active
    assert gain_db(-30.0) - gain_db(5.0) == pytest.approx(by_hand, abs=0.1)


def test_connections_to_other_ports(desk) -> None:
    """Ports that instruments own, and no others."""
    with pytest.raises(KeyError, match="port 7; there are ports 1, 2, 3, 4, 5, 8 and 9"):
        desk.world.connect([(["thru"], [7, 4])])
    with pytest.raises(KeyError, match="port 3 cannot take two connections at once"):
        desk.world.connect([(["thru"], [3, 4]), (["thru"], [3, 5])])
    with pytest.raises(KeyError, match="port 3 cannot take two connections at once"):
        desk.world.connect([(["thru"], [3, 3])])
    desk.world.connect([(["thru"], [3, 4]), (["short"], [1])])
    assert desk.world.connection == "short on port 1 and thru from port 3 to port 4"


def test_paths_between_any_pair(desk) -> None:
    """None where nothing leads; the way back is the way there, transposed."""
    f = np.array([1e8, 2e8])
    desk.world.connect([(["pad-10"], [3, 4])])
    assert desk.world.path(1, 2, f) is None
    there, back = desk.world.path(3, 4, f), desk.world.path(4, 3, f)
    np.testing.assert_allclose(there[:, 1, 0], back[:, 0, 1], atol=1e-12)
    assert 20 * np.log10(abs(there[0, 1, 0])) == pytest.approx(-10, abs=0.1)


def test_the_network_analyzer_sees_what_another_ports_match_ends(desk) -> None:
    """A pad from port 1 to the spectrum analyzer: no more than its match behind 20 dB."""
    desk.world.connect([(["pad-10"], [1, 4])])
    m = desk.world.between_ports(np.array([1e8]))
    assert abs(m[0, 0, 0]) < 0.03
    assert m[0, 1, 0] == 0
    desk.world.connect([(["pad-10"], [4, 1])])
    assert abs(desk.world.between_ports(np.array([1e8]))[0, 0, 0]) < 0.03


@pytest.mark.parametrize(
    ("spec", "says"),
    [
        ("{kind: signal generator}", "instrument 'GPIB0::1::INSTR': 'ports' is missing"),
        ("{kind: spectrum analyzer, ports: [3]}", "instrument 'GPIB0::1::INSTR': 'mixer' is missing"),
        ("{kind: supply, limits: {voltage: [5, 1]}}", "limits of voltage"),
        ("{kind: thermometer, mood: good}", "a thermometer has no 'mood'"),
    ],
)
def test_mistakes_in_a_bench_file(tmp_path: Path, spec: str, says: str) -> None:
    """The sentence says where."""
    path = tmp_path / "bench.yaml"
    path.write_text(f"instruments:\n  GPIB0::1::INSTR: {spec}\n", encoding="utf-8")
    with pytest.raises(BadBench, match=says):
        load_bench(str(path), 1)
