"""Overload and unlock on every instrument that can have them, several faults at once, and their count."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import pyvisa

from sim_instruments.bench import SimulatedBench, load_bench
from sim_instruments.doors.visa import simulated_visa
from sim_instruments.faults import inject

GENERATOR, SPECTRUM, METER = "GPIB0::20::INSTR", "GPIB0::22::INSTR", "GPIB0::13::INSTR"
TONE = ":FREQ 169.4 MHZ;:POW -10 DBM;:OUTP ON"
SETUP = "FREQ:CENT 169.4 MHZ;SPAN 200 KHZ;:BAND 1 KHZ;:SWE:POIN 401;:POW:RANG 0 DBM;:FORM REAL,64"


@pytest.fixture
def chain() -> Callable[..., Callable[[str], Any]]:
    """Generator, thru, spectrum analyzer and a fault; what is made opens an instrument of it."""

    def made(name: str, resource: str, to: int = 4) -> Callable[[str], Any]:
        bench = inject(load_bench("amplifier", 1), name, resource=resource)
        bench.world.connect([(["thru"], [3, to])])
        manager = pyvisa.ResourceManager(simulated_visa(bench.world, bench.instruments))
        sessions: dict[str, Any] = {}

        def session(which: str) -> Any:
            if which not in sessions:
                sessions[which] = manager.open_resource(which, read_termination="\n", write_termination="\n")
            return sessions[which]

        session(GENERATOR).query(f"{TONE};*OPC?")
        return session

    return made


def _trace(session: Any) -> np.ndarray:
    session.write(SETUP)
    session.query("INIT;*OPC?")
    return np.asarray(session.query_binary_values("TRAC? TRACE", "d", is_big_endian=True))


def _condition(session: Any, bit: int) -> int:
    return int(session.query("STAT:QUES:COND?")) >> bit & 1


@pytest.mark.parametrize("resource", [GENERATOR, SPECTRUM])
def test_an_unlocked_oscillator_moves_the_line(chain: Any, resource: str) -> None:
    """The line stands elsewhere at every sweep, and bit 5 says why."""
    session = chain("unlock", resource)
    peaks = {int(np.argmax(_trace(session(SPECTRUM)))) for _ in range(4)}
    assert len(peaks) >= 3
    assert _condition(session(resource), 5) == 1


def test_an_overloaded_receiver_reads_large_lines_low(chain: Any) -> None:
    """Some tenths of a decibel near the reference level."""
    low = _trace(chain("overload", SPECTRUM)(SPECTRUM)).max()
    right = _trace(chain("overload", GENERATOR)(SPECTRUM)).max() + 3.0  # unlevelled, and compressed as little
    assert 0.02 < right - low < 0.6


def test_an_overloaded_generator_sends_less(chain: Any) -> None:
    """It cannot level its output: three decibels are missing, and bit 3 says so."""
    session = chain("overload", GENERATOR)
    assert -18.5 < _trace(session(SPECTRUM)).max() < -15.5  # -10 dBm through 3.4 dB, and 3 dB missing
    assert _condition(session(GENERATOR), 3) == 1
    assert _condition(session(SPECTRUM), 3) == 0


def test_an_overloaded_power_meter_reads_not_a_number(chain: Any) -> None:
    """9.91E+37 (SCPI-1999, 7.2.1.5)."""
    session = chain("overload", METER, 5)
    assert float(session(METER).query("READ?")) == pytest.approx(9.91e37)


def test_what_cannot_have_a_fault_is_named() -> None:
    """A thermometer has no reference to lose."""
    with pytest.raises(ValueError, match=r"no 'unlock' can come to GPIB0::30::INSTR"):
        inject(load_bench("amplifier", 1), "unlock", resource="GPIB0::30::INSTR")


def _two() -> SimulatedBench:
    bench = inject(load_bench("workshop", 1), "error queued", after=1)
    return inject(bench, "identity changed", resource="GPIB0::16::INSTR")


def test_faults_of_one_instrument_do_not_hide_each_other() -> None:
    """The one injected first still happens, and both are counted."""
    bench = _two()
    manager = pyvisa.ResourceManager(simulated_visa(bench.world, bench.instruments))
    session: Any = manager.open_resource("GPIB0::16::INSTR", read_termination="\n", write_termination="\n")
    assert session.query("*IDN?").split(",")[2] == "S0016X"
    session.write("*CLS")
    session.write(":OUTP OFF")
    assert session.query("SYST:ERR?").startswith("-310,")
    assert [(when.name, when.happened > 0) for when in bench.injected] == [
        ("error queued", True),
        ("identity changed", True),
    ]


def test_what_never_has_occasion_is_counted_as_such() -> None:
    """A fault of connections, and no connection made."""
    bench = inject(load_bench("workshop", 1), "open for short")
    assert [(when.seen, when.happened) for when in bench.injected] == [(0, 0)]
