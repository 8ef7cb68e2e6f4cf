"""The DC supply: its words, the current limit, the trip, and what they do to an amplifier."""

from __future__ import annotations

import numpy as np
import pytest

SUPPLY = {"kind": "supply", "limits": {"voltage": [0, 15], "current": [0, 2]}, "lead": 0, "noise": 0}


@pytest.fixture
def bench(make_bench, amplifier):
    return make_bench(amp=amplifier, other=amplifier)


@pytest.fixture
def client(bench):
    bench.world.connect([(["amp"], [1, 2])])
    return bench.add(SUPPLY, **{"voltage error": 0, "current error": 0})


def _gain_db(bench) -> float:
    return float(20 * np.log10(abs(bench.world.between_ports(np.array([1e8]))[0, 1, 0])))


@pytest.mark.parametrize(
    ("setting", "query", "answer"),
    [
        ("SOURce:VOLTage:LEVel:IMMediate:AMPLitude 5 V", "VOLT?", "5"),
        ("VOLT 4500 MV", "SOUR:VOLT:LEV?", "4.5"),
        ("CURR 82 MA", "SOUR:CURR?", "0.082"),
        ("CURR:PROT:STAT ON", "CURR:PROT:STAT?;TRIP?", "1;0"),
        ("OUTP ON;:OUTP OFF", "OUTP:STAT?", "0"),
        ("VOLT MAX", "VOLT? MIN", "0"),
    ],
)
def test_settings_and_their_queries(client, setting: str, query: str, answer: str) -> None:
    """SCPI-1999 Vol. 2, SOURce (from memory)."""
    client.write(setting)
    assert client.ask(query) == answer
    assert client.errors() == []


@pytest.mark.parametrize(
    ("message", "number"), [("VOLT 16", -222), ("CURR 1 V", -131), ("VOLT", -109), ("MEAS:VOLT", -113)]
)
def test_what_it_refuses(client, message: str, number: int) -> None:
    """With the standard's number."""
    assert client.errors(message) == [number]


def test_an_amplifier_works_while_it_is_fed(bench, client) -> None:
    """No gain, 16 dB, no gain."""
    assert _gain_db(bench) < -30
    client.write("VOLT 5;:CURR 0.2;:OUTP ON")
    assert _gain_db(bench) == pytest.approx(16.0, abs=0.02)
    client.write("OUTP OFF")
    assert _gain_db(bench) < -30


def test_it_measures_what_the_amplifier_draws(client) -> None:
    """80 mA at 5 V; a measurement costs time."""
    client.write("VOLT 5;:CURR 0.2;:OUTP ON")
    before = client.instrument.world.time_s
    assert client.number("MEAS:VOLT?") == pytest.approx(5.0)
    assert client.number("MEAS:CURR:DC?") == pytest.approx(0.08)
    assert client.instrument.world.time_s > before
    assert client.ask("STAT:QUES:COND?") == "0"


def test_two_amplifiers_draw_twice(bench, client) -> None:
    """In one row."""
    bench.world.connect([(["amp", "other"], [1, 2])])
    client.write("VOLT 5;:CURR 0.5;:OUTP ON")
    assert client.number("MEAS:CURR?") == pytest.approx(0.16)


def test_nothing_connected_draws_nothing(bench, client) -> None:
    """The voltage stands all the same."""
    bench.world.connect([])
    client.write("VOLT 5;:OUTP ON")
    assert client.number("MEAS:CURR?") == 0.0
    assert client.number("MEAS:VOLT?") == pytest.approx(5.0)


def test_the_lead_costs_voltage(bench) -> None:
    """One ohm of wire: the stage settles where wire and load agree."""
    bench.world.connect([(["amp"], [1, 2])])
    client = bench.add({**SUPPLY, "lead": 1.0}, **{"voltage error": 0, "current error": 0})
    client.write("VOLT 5;:CURR 0.5;:OUTP ON")
    volts, amperes = client.number("MEAS:VOLT?"), client.number("MEAS:CURR?")
    assert volts + 1.0 * amperes == pytest.approx(5.0, abs=1e-6)
    assert 4.9 < volts < 4.95


def test_the_limit_holds_the_current(bench, client) -> None:
    """Below what the stage wants: the voltage gives way, bits 0 and 1 of QUEStionable say so."""
    client.write("VOLT 5;:CURR 0.05;:OUTP ON")
    assert client.number("MEAS:CURR?") == pytest.approx(0.05, abs=1e-6)
    assert 0.5 < client.number("MEAS:VOLT?") < 4.0
    assert int(client.ask("STAT:QUES:COND?")) & 3 == 3
    assert _gain_db(bench) < 15


def test_protection_trips_and_stays_tripped(bench, client) -> None:
    """Output off, bit 1, and no switching on before it is cleared (-221)."""
    client.write("VOLT 5;:CURR 0.05;:CURR:PROT:STAT ON;:OUTP ON")
    assert client.ask("CURR:PROT:TRIP?;:OUTP?") == "1;0"
    assert int(client.ask("STAT:QUES:COND?")) & 2
    assert _gain_db(bench) < -30
    assert client.errors("OUTP ON") == [-221]
    assert client.errors("CURR:PROT:CLE;:CURR 0.2;:OUTP ON") == []
    assert client.ask("CURR:PROT:TRIP?;:OUTP?") == "0;1"
    assert int(client.ask("STAT:QUES:COND?")) & 2 == 0


def test_it_trips_when_the_load_is_connected_later(bench, client) -> None:
    """Not only when somebody asks it."""
    bench.world.connect([])
    client.write("VOLT 5;:CURR 0.05;:CURR:PROT:STAT ON;:OUTP ON")
    assert client.ask("OUTP?") == "1"
    bench.world.connect([(["amp"], [1, 2])])
    assert _gain_db(bench) < -30
    assert client.ask("OUTP?;:CURR:PROT:TRIP?") == "0;1"


def test_reset(client) -> None:
    """Output off at 0 V, protection off, no trip."""
    client.write("VOLT 5;:CURR 0.05;:CURR:PROT:STAT ON;:OUTP ON", "*RST")
    assert client.ask("VOLT?;:OUTP?;:CURR:PROT:STAT?;TRIP?") == "0;0;0;0"


def test_one_supply_a_bench(bench, client) -> None:
    """A second would be ambiguous."""
    with pytest.raises(ValueError, match="another supply feeds this bench already"):
        bench.add(SUPPLY)
