"""The spectrum analyzer: its words, coupled settings, sweeping, formats, dialects.

SCPI-1999 Vol. 2 by facts.md 7.6 and from memory; manners by IEEE 488.2, facts.md 7.1 to 7.5.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest

LIMITS = {"frequency": ["9 kHz", "6 GHz"], "bandwidth": ["10 Hz", "3 MHz"], "points": 1001}


@pytest.fixture
def client(make_bench, analyzer):
    return make_bench().add(analyzer, limits=LIMITS, manners={"steps": [1, 3]})


@pytest.mark.parametrize(
    ("setting", "query", "answer"),
    [
        ("SENSe:FREQuency:CENTer 1 GHZ;SPAN 10 MHZ", "FREQ:STAR?;STOP?", "995000000;1005000000"),
        ("FREQ:STAR 100 MHZ;STOP 300 MHZ", "FREQ:CENT?;SPAN?", "200000000;200000000"),
        ("FREQ:STAR 100 MHZ;STOP 300 MHZ;SPAN:FULL", "FREQ:SPAN?", "5999991000"),
        ("FREQ:STOP 1 GHZ;STAR 2 GHZ", "FREQ:STAR?;STOP?", "2000000000;2000000000"),
        ("FREQ:SPAN 10 MHZ", "BAND?;BAND:VID?;:BAND:AUTO?", "100000;100000;1"),
        ("SENS:BWID:RES 3 KHZ", "BAND:RES?;:BAND:RES:AUTO?;:BAND:VID?", "3000;0;3000"),
        ("BAND 10 KHZ;:BAND:VID 100 HZ", "BAND:VID?;VID:AUTO?", "100;0"),
        ("DETector:FUNCtion AVERage", "SENS:DET?", "AVER"),
        ("POW:AC:RANG:UPP 7 DBM", "POW:RANG?;:POW:ATT?;:POW:ATT:AUTO?", "7;20;1"),
        ("SENS:POW:AC:ATT 30 DB;:POW:RANG -40", "POW:ATT?;:POW:ATT:AUTO?", "30;0"),
        ("POW:ATT 30;:POW:ATT:AUTO ON", "POW:ATT?", "10"),
        ("BAND:AUTO OFF;:FREQ:SPAN 1 MHZ", "BAND?", "3000000"),
        ("SWE:POIN 201", "SENS:SWE:POIN? MAX", "1001"),
        ("SWE:TIME 2 S", "SWE:TIME?;TIME:AUTO?", "2;0"),
        ("SWE:TIME 2 S;TIME:AUTO ON;:SWE:POIN 101", "SWE:TIME:AUTO?", "1"),
        ("TRIG:SEQ:SOUR BUS", "TRIG:SOUR?", "BUS"),
        ("INIT:CONT ON", "INIT:CONT?", "1"),
        ("FORM REAL,32;:FORM:BORD SWAP", "FORM?;:FORM:BORD?", "REAL,32;SWAP"),
        ("SWE:POIN 11", "TRAC:POIN? TRACE;:TRAC:CAT?", '11;"TRACE","GRID"'),
    ],
)  # fmt: skip
def test_settings_and_their_queries(client, setting: str, query: str, answer: str) -> None:
    """Short and long words, units, settings that follow each other."""
    client.write(setting)
    assert client.ask(query) == answer
    assert client.errors() == []


@pytest.mark.parametrize(
    ("message", "number"),
    [
        ("FREQ:CENT 7 GHZ", -222), ("BAND 10 MHZ", -222), ("SWE:POIN 1", -222), ("DET PEAK", -224),
        ("POW:ATT 60", -222), ("POW:ATT 10 V", -131), ("FORM REAL,16", -224), ("TRAC? WAVE", -224),
        ("TRAC? TRACE", -230), ("TRAC?", -109), ("*TRG", -211), ("INIT;:INIT", -213), ("MARK:MAX", -113),
        ("TRIG:SOUR BUS;:INIT;:TRAC? TRACE", -214), ("INIT:CONT ON;:INIT", -213),
    ],
)  # fmt: skip
def test_what_it_refuses(client, message: str, number: int) -> None:
    """With the standard's number."""
    assert client.errors(message) == [number]


def test_sweep_time_goes_as_span_over_bandwidth_squared(client) -> None:
    """Ten times finer: a hundred times longer (common practice)."""
    client.write("FREQ:CENT 1 GHZ;SPAN 100 MHZ;:BAND 100 KHZ")
    slow = [client.number("SWE:TIME?")]
    for setting in ("BAND 10 KHZ", "FREQ:SPAN 200 MHZ", "BAND:VID 1 KHZ"):
        client.write(setting)
        slow.append(client.number("SWE:TIME?"))
    assert [b / a for a, b in itertools.pairwise(slow)] == pytest.approx([100, 2, 10])


def test_a_sweep_costs_its_time_and_no_more(client) -> None:
    """On the bench's clock, awaited by *OPC?."""
    client.write("FREQ:CENT 1 GHZ;SPAN 100 MHZ;:BAND 10 KHZ;:INIT")
    world = client.instrument.world
    before = world.time_s
    assert int(client.ask("STAT:OPER:COND?")) & 8
    assert client.ask("*OPC?") == "1"
    assert world.time_s - before == pytest.approx(client.number("SWE:TIME?"), rel=0.01)
    assert not int(client.ask("STAT:OPER:COND?")) & 8


def test_too_fast_a_sweep_is_reported_and_reads_low(make_bench, generator, analyzer) -> None:
    """Bit 8 of QUEStionable; the loss of a Gaussian filter swept too fast (from memory)."""
    bench = make_bench()
    source, client = bench.add(generator), bench.add(analyzer)
    bench.world.connect([(["thru"], [3, 4])])
    source.write("FREQ 1 GHZ;:POW 0;:OUTP ON")
    settings = ("FREQ:CENT 1 GHZ;SPAN 100 MHZ;:BAND 100 KHZ;:POW:RANG 10;:SWE:POIN 101",)
    right = client.trace(*settings).max()
    assert not int(client.ask("STAT:QUES:COND?")) & 256
    client.write(f"SWE:TIME {client.number('SWE:TIME?') / 10}")
    hasty = client.trace().max()
    assert int(client.ask("STAT:QUES:COND?")) & 256
    assert right - hasty == pytest.approx(5 * np.log10(1 + 0.195 * 4.0**2), abs=0.05)


def test_bus_trigger(client) -> None:
    """It waits (bit 5), *TRG starts it."""
    client.write("TRIG:SOUR BUS;:INIT")
    assert client.ask("STAT:OPER:COND?") == "32"
    assert client.errors("*TRG") == []
    assert client.ask("*OPC?") == "1"
    assert len(client.ask("TRAC? TRACE").split(",")) == 401


def test_abort_ends_a_sweep_without_result(client) -> None:
    """Idle at once, nothing to fetch."""
    assert client.errors("INIT;:ABOR") == []
    assert client.ask("STAT:OPER:COND?") == "0"
    assert client.errors("TRAC? TRACE") == [-230]


def test_continuous_sweeps_bring_new_traces(client) -> None:
    """*OPC? does not wait for them; two readings differ in their noise."""
    client.write("INIT:CONT ON")
    one, two = client.ask("TRAC? TRACE"), client.ask("TRAC? TRACE")
    assert one != two
    assert client.ask("*OPC?") == "1"
    client.write("INIT:CONT OFF")
    assert client.errors() == []


@pytest.mark.parametrize(("form", "kind", "digits"), [("REAL,64", ">f8", 12), ("REAL,32", ">f4", 5)])
def test_blocks_hold_the_same_levels_as_text(client, form: str, kind: str, digits: int) -> None:
    """Definite blocks, most significant byte first, then swapped (IEEE 488.2 8.7.9, SCPI-1999)."""
    client.write("SWE:POIN 101;:INIT")
    text = np.array([float(v) for v in client.ask("TRAC? TRACE").split(",")])
    for border, dtype in (("NORM", kind), ("SWAP", kind.replace(">", "<"))):
        client.write(f"FORM {form};:FORM:BORD {border}")
        answer = client.ask_bytes("TRAC? TRACE")
        length = int(answer[2 : 2 + int(answer[1:2])])
        assert answer[-1:] == b"\n"
        data = np.frombuffer(answer[2 + int(answer[1:2]) : -1], dtype)
        assert len(data) * data.itemsize == length
        np.testing.assert_allclose(data, text, rtol=10.0 ** -min(digits, 8))


def test_the_grid_comes_without_a_sweep(client) -> None:
    """Middles of the buckets in Hz."""
    client.write("FREQ:STAR 100 MHZ;STOP 300 MHZ;:SWE:POIN 3")
    assert [float(v) for v in client.ask("TRAC? GRID").split(",")] == [100e6, 200e6, 300e6]


def test_the_other_dialect(make_bench, analyzer) -> None:
    """Reference level under DISPlay, another trace name, NR3, steps insisted on, no setting in mid-sweep."""
    client = make_bench().add(
        analyzer, limits={"attenuation": 30, "attenuation step": 5},
        manners={"steps": [1, 2, 5], "between steps": "refuse", "while sweeping": "refuse",
                 "reference": "display", "trace": "TRACE1", "numbers": "scientific"},
    )  # fmt: skip
    assert client.errors("POW:RANG -10") == [-113]
    assert client.errors("DISP:WIND:TRAC:Y:SCAL:RLEV -7 DBM") == []
    assert client.ask("DISP:TRAC:Y:RLEV?") == "-7.00000000000E+00"
    assert client.number("POW:ATT?") == 5.0
    assert client.errors("BAND 3 KHZ") == [-222]
    assert client.errors("BAND 2 KHZ") == []
    assert client.errors("INIT;:BAND 5 KHZ") == [-221]
    assert client.errors("TRAC? TRACE") == [-224]
    assert len(client.ask("TRAC? TRACE1").split(",")) == 401


def test_beyond_a_limit_the_nearest(make_bench, analyzer) -> None:
    """-222 is queued and the limit taken, where the manners say so."""
    client = make_bench().add(analyzer, limits=LIMITS, manners={"beyond limits": "nearest"})
    assert client.errors("FREQ:STOP 7 GHZ") == [-222]
    assert client.number("FREQ:STOP?") == 6e9


def test_reset_couples_everything_again(client) -> None:
    """As after power on."""
    before = client.ask("FREQ:STAR?;STOP?;:BAND?;:POW:RANG?;ATT?;:SWE:POIN?;TIME?;:DET?;:FORM?")
    client.write(
        "FREQ:SPAN 0;:BAND 10;:POW:RANG 20;ATT 0;:SWE:POIN 5;:DET SAMP;:FORM REAL;:INIT:CONT ON", "*RST"
    )
    assert client.ask("FREQ:STAR?;STOP?;:BAND?;:POW:RANG?;ATT?;:SWE:POIN?;TIME?;:DET?;:FORM?") == before
    assert client.ask("INIT:CONT?") == "0"


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"limits": {"points": 1}}, "a sweep has two at least"),
        ({"limits": {"wit": 1}}, "limits has no 'wit'"),
        ({"mixer": {"noise figure": 20, "cheese": 1}}, "mixer has no 'cheese'"),
        ({"manners": {"reference": "mirror"}}, "'mirror'; allowed are range, display"),
    ],
)
def test_descriptions_that_make_no_sense(make_bench, analyzer, change, says: str) -> None:
    """A sentence with the value and what was allowed."""
    with pytest.raises(ValueError, match=says):
        make_bench().add(analyzer, **change)


def test_residual_lines_are_there_without_a_signal(make_bench, analyzer) -> None:
    """They belong to the mixer: attenuation lifts them, as it lifts the floor."""
    analyzer["mixer"]["residual"] = [{"at": "50 MHz", "level": "-90 dBm"}]
    client = make_bench().add(analyzer)
    settings = "FREQ:CENT 50 MHZ;SPAN 10 KHZ;:BAND 100 HZ;:SWE:POIN 101"
    heights = [client.trace(settings, f"POW:ATT {db}")[50] for db in (0, 20)]
    assert heights == pytest.approx([-90.0, -70.0], abs=0.3)
