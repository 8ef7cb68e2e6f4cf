"""The signal generator: its words, its limits, what comes out of it."""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.instruments.signals import dbm


@pytest.fixture
def client(make_bench, generator):
    return make_bench().add(generator, limits={"frequency": ["1 MHz", "3 GHz"], "power": [-60, 10]})


def test_it_says_that_it_is_simulated(client) -> None:
    """Maker SIMULATED, four fields."""
    assert client.ask("*IDN?").split(",")[0] == "SIMULATED"
    assert client.ask("*IDN?").count(",") == 3


@pytest.mark.parametrize(
    ("setting", "query", "answer"),
    [
        ("SOURce:FREQuency:CW 169 MHZ", "FREQ?", "169000000"),
        ("FREQ:FIX 1.5e9", "SOUR:FREQ:CW?", "1500000000"),
        ("SOUR:POW:LEV:IMM:AMPL -10 DBM", "SOURCE:POWER?", "-10"),
        ("POW MIN", "POW:LEV?", "-60"),
        ("OUTP:STAT ON", "OUTP?", "1"),
        ("OUTP 1;:OUTP OFF", "OUTP?", "0"),
    ],
)
def test_settings_and_their_queries(client, setting: str, query: str, answer: str) -> None:
    """In every spelling of SCPI-1999 Vol. 2 (nodes from memory)."""
    client.write(setting)
    assert client.ask(query) == answer
    assert client.errors() == []


@pytest.mark.parametrize(
    ("message", "number"),
    [
        ("FREQ 5 GHZ", -222), ("POW 11", -222), ("POW 3 V", -131), ("FREQ", -109), ("FREQ 1,2", -108),
        ("OUTP MAYBE", -141), ("FREQ ABC", -141), ("FRE 1", -113), ("*TRG", -211),
    ],
)  # fmt: skip
def test_what_it_refuses(client, message: str, number: int) -> None:
    """With the standard's number, and the setting as it was."""
    before = client.ask("FREQ?;:POW?;:OUTP?")
    assert client.errors(message) == [number]
    assert client.ask("FREQ?;:POW?;:OUTP?") == before


def test_reset_switches_the_output_off(client) -> None:
    """Whatever was set before."""
    client.write("OUTP ON;:POW 5", "*RST")
    assert client.ask("OUTP?;:POW?") == "0;-60"


def test_a_setting_settles_before_the_operation_is_complete(client) -> None:
    """*OPC? costs the settling time."""
    world = client.instrument.world
    before = world.time_s
    client.write("FREQ 200 MHZ")
    assert client.ask("*OPC?") == "1"
    assert world.time_s - before == pytest.approx(3e-3)


def test_the_other_dialect(make_bench, generator) -> None:
    """SOURce is not left out there, numbers are NR3, and beyond a limit is the limit."""
    client = make_bench().add(
        generator, limits={"power": [-60, 10]}, resolution=0.1,
        manners={"source node": "required", "numbers": "scientific", "beyond limits": "nearest"},
    )  # fmt: skip
    assert client.errors("POW 3") == [-113]
    assert client.errors("SOUR:POW 30") == [-222]
    assert client.ask("SOUR:POW?") == "+1.00000000000E+01"
    client.write("SOUR:POW -3.14")
    assert client.number("SOUR:POW?") == pytest.approx(-3.1)


def test_harmonics_stand_where_they_are_declared(make_bench, generator) -> None:
    """-35 dBc and -45 dBc at twice and three times the carrier."""
    client = make_bench().add(generator, harmonics=["-35 dB", "-45 dB"])
    client.write("FREQ 169 MHZ;:POW -10;:OUTP ON")
    signal = client.instrument.signal()
    np.testing.assert_allclose(signal.f_hz, np.array([1, 2, 3]) * 169e6)
    np.testing.assert_allclose(dbm(abs(signal.wave) ** 2), [-10, -45, -55], atol=1e-9)


def test_output_off_sends_only_thermal_noise(client) -> None:
    """kT0 at 290 K is -173.975 dBm/Hz (facts.md 9.5, SI constants)."""
    client.write("POW 10;:OUTP OFF")
    signal = client.instrument.signal()
    assert len(signal.wave) == 0
    assert dbm(signal.noise(np.array([1e8])))[0] == pytest.approx(-173.975, abs=1e-3)


def test_level_errors_are_within_what_is_declared(make_bench, generator) -> None:
    """An error of the specimen and a ripple over frequency: neither nothing nor beyond four deviations."""
    client = make_bench().add(generator, **{"level error": 0.2, "flatness": 0.15})
    client.write("POW 0;:OUTP ON")
    off = np.array([client.instrument.true_level_dbm(f) for f in np.linspace(1e7, 3e9, 100)])
    assert 0.02 < np.std(off) < 0.3
    assert np.max(abs(off)) < 0.2 * 2 + 0.15 * np.sqrt(6)


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"colour": "red"}, "a signal generator has no 'colour'"),
        ({"manners": {"numbers": "roman"}}, "'roman'; allowed are plain, scientific"),
        ({"limits": {"power": [10, -60]}}, "is no range; write the lower end first"),
        ({"ports": [1]}, "port 1 belongs to another instrument already"),
    ],
)
def test_descriptions_that_make_no_sense(make_bench, generator, change, says: str) -> None:
    """A sentence with the value and what was allowed."""
    with pytest.raises(ValueError, match=says):
        make_bench().add(generator, **change)


def test_spurious_lines_stand_beside_the_carrier(make_bench, generator) -> None:
    """Where they are declared, that much below it; none below 0 Hz."""
    client = make_bench().add(
        generator, spurious=[{"offset": 8e6, "level": "-60 dB"}, {"offset": -2e8, "level": 50}]
    )
    client.write("FREQ 100 MHZ;:POW 0 DBM;:OUTP ON")
    signal = client.instrument.signal()
    lines = dict(zip(signal.f_hz.tolist(), dbm(abs(signal.wave) ** 2).tolist(), strict=True))
    assert lines[108e6] == pytest.approx(lines[100e6] - 60.0)
    assert min(lines) > 0
