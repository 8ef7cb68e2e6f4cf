"""The switch matrix: channel lists, connections without hands, repeatability, isolation."""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.instruments.switch import channel_list
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.waves import Matrix

F = np.array([1e8, 1e9])
SWITCH = {
    "kind": "switch matrix", "loss": 0.1, "delay": 0, "isolation": 80, "repeatability": 0.01, "contact": 0,
    "channels": {
        101: {"items": ["pad"], "ports": [1, 2]},
        102: {"items": ["thru"], "ports": [1, 2]},
        111: {"items": ["short"], "ports": [1]},
        121: {"items": ["short"], "ports": [2]},
        103: {"items": ["thru"], "ports": [3, 4]},
    },
}  # fmt: skip


@pytest.fixture
def bench(make_bench):
    return make_bench(pad={"kind": "pad", "loss": "10 dB"}, short={"kind": "standard", "standard": "short"})


@pytest.fixture
def client(bench):
    return bench.add(SWITCH)


def _through(bench) -> Matrix:
    return bench.world.between_ports(F)


def _db(value) -> float:
    return float(20 * np.log10(abs(value)))


@pytest.mark.parametrize(
    ("text", "channels"), [("(@101)", [101]), ("( @ 1 , 3:5 )", [1, 3, 4, 5]), ("(@7:7,7)", [7, 7])]
)
def test_channel_lists(text: str, channels: list[int]) -> None:
    """SCPI-1999 Vol. 1, 8.3.2 (from memory)."""
    assert channel_list(text) == channels


@pytest.mark.parametrize(
    ("text", "number"),
    [("(101)", -171), ("(@)", -171), ("(@1,)", -171), ("(@5:3)", -171), ("(@1:99999)", -223), ("101", -128),
     ("ALL", -148), ("'1'", -158)],
)  # fmt: skip
def test_lists_that_are_none(text: str, number: int) -> None:
    """Each by its kind."""
    with pytest.raises(ScpiError) as error:
        channel_list(text)
    assert error.value.number == number


def test_closing_connects_and_opening_takes_off(bench, client) -> None:
    """A pad with two contacts, on the bench's clock within a moment."""
    before = bench.world.time_s
    client.write("ROUT:CLOS (@101)")
    assert client.ask("*OPC?") == "1"
    assert bench.world.time_s - before < 0.1
    assert bench.world.connection == "pad from port 1 to port 2"
    assert _db(_through(bench)[1, 1, 0]) == pytest.approx(-10.2, abs=0.05)
    client.write("ROUT:OPEN (@101)")
    assert bench.world.connection == "nothing"


def test_queries(client) -> None:
    """Closed and open, each the other's opposite; the list of what is closed."""
    client.write("ROUT:CLOS (@101,103)")
    assert client.ask("ROUT:CLOS? (@101:103)") == "1,0,1"
    assert client.ask("ROUT:OPEN? (@101:103)") == "0,1,0"
    assert client.ask("ROUT:CLOS:STAT?") == "(@101,103)"
    client.write("ROUT:OPEN:ALL")
    assert client.ask("ROUT:CLOS:STAT?") == "(@)"
    assert client.errors() == []


@pytest.mark.parametrize(
    ("message", "number"),
    [("ROUT:CLOS (@999)", -222), ("ROUT:CLOS 101", -128), ("ROUT:CLOS", -109),
     ("ROUT:CLOS (@101,102)", -221), ("ROUT:CLOS (@101);CLOS (@111)", -221)],
)  # fmt: skip
def test_what_it_refuses(client, message: str, number: int) -> None:
    """An unknown channel, no list, two channels on one port."""
    assert client.errors(message) == [number]


def test_a_refused_list_changes_nothing(client) -> None:
    """All or none."""
    client.errors("ROUT:CLOS (@103,101,102)")
    assert client.ask("ROUT:CLOS:STAT?") == "(@)"


def test_the_other_manners_release_what_is_in_the_way(bench) -> None:
    """Closing 102 opens 101."""
    client = bench.add(SWITCH, manners={"on conflict": "release"})
    client.write("ROUT:CLOS (@101);:ROUT:CLOS (@102)")
    assert client.ask("ROUT:CLOS:STAT?") == "(@102)"
    assert client.errors() == []


def test_contacts_bounce_before_they_settle(bench, client) -> None:
    """Nothing is connected until then; what was closed before stays."""
    client.write("ROUT:CLOS (@101)")
    assert bench.world.connection == "nothing"
    client.ask("*OPC?")
    client.write("ROUT:CLOS (@103)")
    assert bench.world.connection == "pad from port 1 to port 2"


def test_each_switching_repeats_within_its_deviation(bench, client) -> None:
    """0.01 dB at each of two contacts: 0.014 dB in all; staying closed changes nothing."""
    levels = []
    for _ in range(60):
        client.write("ROUT:CLOS (@102)")
        client.ask("*OPC?")
        levels.append(_db(_through(bench)[1, 1, 0]))
        assert _db(_through(bench)[1, 1, 0]) == levels[-1]
        client.write("ROUT:OPEN:ALL")
    assert np.std(levels) == pytest.approx(0.014, rel=0.3)


def test_an_open_channel_leaks(bench, client) -> None:
    """80 dB at 1 GHz, 20 dB more at 100 MHz; two channels add, the pad's is 10 dB down."""
    leak = _through(bench)[:, 1, 0]
    one = 10 ** (-80 / 20)
    assert abs(leak[1]) == pytest.approx(one * (1 + 10**-0.5), rel=1e-2)
    assert _db(leak[1] / leak[0]) == pytest.approx(20, abs=0.1)
    np.testing.assert_allclose(_through(bench)[:, 0, 1], leak)


def test_a_signal_leaks_too(bench, client, generator, analyzer) -> None:
    """Generator and spectrum analyzer with the channel between them open."""
    source = bench.add(generator)
    bench.add(analyzer)
    source.write("FREQ 1 GHZ;:POW 0;:OUTP ON")
    level = bench.world.arriving(4).wave
    assert _db(level[0]) == pytest.approx(-80, abs=0.1)


def test_standards_on_both_ports_at_once(bench, client) -> None:
    """One channel for each port."""
    client.write("ROUT:CLOS (@111,121)")
    client.ask("*OPC?")
    assert bench.world.connection == "short on port 1 and short on port 2"
    assert _db(_through(bench)[0, 0, 0]) == pytest.approx(-0.06, abs=0.03)


def test_hands_take_the_switchs_cable_off(bench, client) -> None:
    """What hands connect to a port counts there."""
    client.write("ROUT:CLOS (@101)")
    client.ask("*OPC?")
    bench.world.connect([(["short"], [1])])
    assert bench.world.connection == "short on port 1"
    bench.world.connect([])
    assert bench.world.connection == "pad from port 1 to port 2"


def test_no_unit_no_connection(make_bench) -> None:
    """A channel for the unit connects nothing before one lies there."""
    bench = make_bench()
    client = bench.add(SWITCH, channels={1: {"items": ["unit"], "ports": [1, 2]}})
    client.write("ROUT:CLOS (@1)")
    client.ask("*OPC?")
    assert bench.world.connection == "nothing"


def test_a_channel_with_an_unknown_item(make_bench) -> None:
    """Said when the bench is made."""
    with pytest.raises(ValueError, match="channel 1: the bench has no 'sling'"):
        make_bench().add(SWITCH, channels={1: {"items": ["sling"], "ports": [1, 2]}})
