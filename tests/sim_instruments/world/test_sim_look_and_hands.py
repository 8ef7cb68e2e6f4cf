"""The console's hands and the drawing, on a bench with more ports than an analyzer has; values in files."""

from __future__ import annotations

from io import StringIO

import pytest

from sim_instruments.bench import load_bench
from sim_instruments.console import Console
from sim_instruments.look import draw, owners
from sim_instruments.values import number, share


@pytest.fixture
def bench():
    return load_bench("amplifier", 1)


def _said(bench, *lines: str) -> str:
    out = StringIO()
    console = Console(bench, out)
    for line in lines:
        console.carry_out(line)
    return out.getvalue()


def test_hands_reach_every_port_of_the_bench(bench) -> None:
    """Generator to spectrum analyzer, and a load on the power meter."""
    said = _said(bench, "connect cable-in, thru from port 3 to port 4", "connect load to port 5")
    assert "connected: cable-in, thru from port 3 to port 4 and load on port 5" in said
    assert "connected: load on port 5" in _said(bench, "disconnect port 4")


def test_a_port_that_is_none_is_answered_with_those_there_are(bench) -> None:
    """On both of the orders that name one."""
    assert "there is no port 7; the bench has ports 1, 2, 3, 4, 5, 8 and 9" in _said(
        bench, "connect load to port 7"
    )
    assert "with N one of 1, 2, 3, 4, 5, 8 and 9" in _said(bench, "disconnect port 7")
    assert "the bench has ports 1 and 2" in _said(load_bench("workshop", 1), "connect load to port 3")


def test_the_drawing_shows_every_port_and_whose_it_is(bench) -> None:
    """What is plugged by hand, what by a switch, and what is free."""
    bench.world.offer("DA-0001")
    bench.world.connect([(["thru"], [8, 9])])
    switch = bench.instruments["GPIB0::9::INSTR"].line()
    switch.receive(b"ROUT:CLOS (@103)\n", True)
    bench.world.advance(1.0)
    drawn = draw(bench)
    assert "port 8 ═══│ thru │═══ port 9" in drawn
    assert "port 3 ╌╌╌│ unit DA-0001 │╌╌╌ port 4" in drawn
    assert "port 5  ──  nothing" in drawn
    assert owners(bench) == {
        1: "network analyzer",
        2: "network analyzer",
        3: "generator S0019 and generator S0020",
        4: "spectrum analyzer S0022",
        5: "power meter S0013",
        8: "generator S0021",
        9: "spectrum analyzer S0023",
    }


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("30 ps", 3e-11),
        ("1.3 Gohm/s", 1.3e9),
        ("2e-5 pF", 2e-17),
        ("-40 dBm", -40.0),
        ("82 mA", 0.082),
        ("10k", 1e4),
        (5, 5.0),
        ("inf", float("inf")),
    ],
)
def test_values_with_their_unit(written: object, value: float) -> None:
    """A prefix is a power of ten, to the last bit."""
    assert number(written) == value


@pytest.mark.parametrize(
    "written", ["10 apples", "5 %", "1 mdB", "nan", float("nan"), True, "", "ten", "1_000", "1 5"]
)
def test_what_is_no_value_is_refused(written: object) -> None:
    """With the text, and what is known where a unit is not."""
    with pytest.raises(ValueError, match=r"is no value with a unit|known are Hz, s, F"):
        number(written)


@pytest.mark.parametrize("written", ["2", "two %", "nan %", "%"])
def test_what_is_no_percentage_is_refused(written: str) -> None:
    """A share needs its sign."""
    with pytest.raises(ValueError, match="is no percentage"):
        share(written)
