"""Instruments that go wrong, seen by a PyVISA program: each does what its description says."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

import numpy as np
import pytest
import pyvisa

from sim_instruments.bench import load_bench
from sim_instruments.doors.visa import simulated_visa
from sim_instruments.faults import inject

SWEEP = ":FREQ:STAR 50 MHz;:FREQ:STOP 500 MHz;:SWE:POIN 21;:BAND 1000;:OUTP ON;:FORM REAL,64"


@contextmanager
def _session(name: str | None, **chance: Any) -> Iterator[Any]:
    bench = load_bench("workshop", 1)
    if name is not None:
        bench = inject(bench, name, **chance)
    bench.world.offer("HF-0001")
    bench.world.connect([(["unit"], [1, 2])])
    manager = pyvisa.ResourceManager(simulated_visa(bench.world, bench.instruments))
    session: Any = manager.open_resource("GPIB0::16::INSTR", read_termination="\n", write_termination="\n")
    session.bench = bench
    yield session
    manager.close()


def _raw(session: Any, query: str) -> bytes:
    """All bytes up to END, whatever is among them."""
    session.write(query)
    session.read_termination = None
    try:
        return bytes(session.read_raw())
    finally:
        session.read_termination = "\n"


def _sweep(session: Any) -> bytes:
    session.query(":INIT;*OPC?")
    return _raw(session, ":TRAC? MATRIX")


def _read(session: Any) -> np.ndarray:
    return np.frombuffer(_sweep(session)[6:-1], ">f8")


def _errors(session: Any) -> list[str]:
    found = []
    while not (entry := session.query("SYST:ERR?")).startswith("0,"):
        found.append(entry.split(",")[0])
    return found


def test_without_a_fault_all_goes_well() -> None:
    """The reading that the others are compared with."""
    with _session(None) as session:
        session.write(SWEEP)
        data = _read(session)
        assert data.shape == (21 * 8,)
        assert np.all(np.isfinite(data))
        assert _errors(session) == []


def test_no_answer_and_nothing_queued() -> None:
    """One timeout, no error, then all is well."""
    with _session("no answer", after=1) as session:
        assert session.query("*IDN?").startswith("SIMULATED")
        with pytest.raises(pyvisa.VisaIOError, match="Timeout"):
            session.query("*IDN?")
        session.bench.instruments["GPIB0::16::INSTR"].when.probability = 0.0
        assert _errors(session) == []


def test_late_answer_is_taken_for_the_next() -> None:
    """After a timeout and a minute, the old answer comes to the new query."""
    with _session("late answer", probability=1.0) as session:
        with pytest.raises(pyvisa.VisaIOError, match="Timeout"):
            session.query("*IDN?")
        session.bench.instruments["GPIB0::16::INSTR"].when.probability = 0.0
        session.bench.world.advance(60.0)
        assert session.read().startswith("SIMULATED")


def test_an_answer_cut_short() -> None:
    """Half of it, then a timeout."""
    with _session("answer cut short") as session, pytest.raises(pyvisa.VisaIOError, match="Timeout"):
        session.query("*IDN?")


def test_a_cut_answer_leaves_bytes_in_hand() -> None:
    """The first half is there to be looked at."""
    with _session("answer cut short") as session:
        session.write("*IDN?")
        half = session.read_bytes(10)
        assert b"SIMULATED,".startswith(half)


def test_wrong_block_length() -> None:
    """Eight bytes are promised that do not come."""
    with _session("wrong block length") as session:
        session.write(SWEEP)
        raw = _sweep(session)
        assert int(raw[2:6]) == len(raw) - 7 + 8 == 21 * 64 + 8


def test_garbage() -> None:
    """As long as it was due, and no text."""
    with _session("garbage") as session:
        raw = _raw(session, "*IDN?")
        assert all(b >= 128 for b in raw[:-1])
        assert len(raw) > 20


@pytest.mark.parametrize("form", ["REAL,64", "REAL,32"])
@pytest.mark.parametrize("border", ["NORM", "SWAP"])
def test_a_reading_that_is_no_number_in_a_block(form: str, border: str) -> None:
    """NaN in each size and byte order, one value or two beside each other, and the rest as it was."""
    with _session("NaN in data") as session:
        session.write(f"{SWEEP};:FORM {form};:FORM:BORD {border}")
        raw = _sweep(session)
        kind = f"{'>' if border == 'NORM' else '<'}f{int(form[-2:]) // 8}"
        data = np.frombuffer(raw[2 + int(raw[1:2]) : -1], kind)
        assert 1 <= np.count_nonzero(np.isnan(data)) <= 2
        assert data.size == 21 * 8


def test_a_reading_that_is_no_number_in_text() -> None:
    """9.91E37."""
    with _session("NaN in data") as session:
        session.write(f"{SWEEP};:FORM ASC")
        session.query(":INIT;*OPC?")
        assert session.query(":TRAC? MATRIX").split(",").count("9.91E37") == 1


def test_a_stale_answer_does_not_change() -> None:
    """Two sweeps alike to the last bit: impossible with noise."""
    with _session(None) as session:
        session.write(SWEEP)
        assert np.any(_read(session) != _read(session))
    with _session("stale answer") as session:
        session.write(SWEEP)
        np.testing.assert_array_equal(_read(session), _read(session))


def test_an_error_stands_in_the_queue() -> None:
    """-310, once if told so, and readings as usual."""
    with _session("error queued", after=1, probability=0.5, seed=3) as session:
        session.write(SWEEP)
        assert np.all(np.isfinite(_read(session)))
        when = session.bench.instruments["GPIB0::16::INSTR"].when
        happened, when.probability = when.happened, 0.0
        assert happened > 0
        assert _errors(session) == ["-310"] * happened


def test_the_queue_overflows() -> None:
    """Full of -310, the last is -350."""
    with _session("queue overflow") as session:
        session.write(SWEEP)
        found = _errors(session)
        assert set(found[:-1]) == {"-310"}
        assert found[-1] == "-350"


def test_the_identity_changes() -> None:
    """Another serial number from the second time on."""
    with _session("identity changed", after=1) as session:
        first, second = session.query("*IDN?").split(","), session.query("*IDN?").split(",")
        assert first[2] != second[2]
        assert [first[0], first[1], first[3]] == [second[0], second[1], second[3]]


def test_a_restart_in_mid_sweep() -> None:
    """No answer, settings lost, power-on in the event status register; once."""
    with _session("restart in mid-sweep") as session:
        session.write(SWEEP)
        session.query("*ESR?")
        with pytest.raises(pyvisa.VisaIOError, match="Timeout"):
            session.query(":INIT;*OPC?")
        assert int(session.query("*ESR?")) & 128
        assert float(session.query(":SWE:POIN?")) != 21
        session.write(SWEEP)
        assert np.all(np.isfinite(_read(session)))


def test_the_line_is_closed() -> None:
    """Nothing goes any more, and opening again fails."""
    with _session("line closed", after=1) as session:
        session.query("*IDN?")
        with pytest.raises(pyvisa.VisaIOError):
            session.query("*IDN?")
        with pytest.raises(pyvisa.VisaIOError):
            session.write("*CLS")


def test_a_dribbling_answer_is_whole() -> None:
    """Seven bytes at a time, and all of them."""
    with _session("dribbling") as session:
        session.write(SWEEP)
        assert session.query("*IDN?").startswith("SIMULATED,NA-2,S0016")
        assert _read(session).shape == (21 * 8,)


def test_an_unlocked_reference_spoils_phases_and_says_so() -> None:
    """Neighbouring points differ by tens of degrees; bit 5 of the questionable condition."""
    with _session("unlock") as session:
        session.write(SWEEP)
        one, two = _read(session), _read(session)
        s11 = [d.reshape(21, 4, 2)[:, 0] @ [1, 1j] for d in (one, two)]
        assert 10 < np.std(np.angle(s11[0] / s11[1], deg=True)) < 60
        assert int(session.query("STAT:QUES:COND?")) & 32


def test_an_overload_compresses_and_says_so() -> None:
    """Large readings low by tenths of a decibel, small ones right; bit 3 of the questionable condition."""
    with _session(None) as session:
        session.write(SWEEP)
        right = _read(session)
    with _session("overload", after=1) as session:
        session.write(SWEEP)
        np.testing.assert_allclose(_read(session), right, rtol=0, atol=1e-12)
        assert not int(session.query("STAT:QUES:COND?")) & 8
        spoilt = _read(session)
        big, small = abs(right) > 0.5, abs(right) < 0.05
        assert np.all(abs(spoilt[big]) < 0.99 * abs(right[big]))
        np.testing.assert_allclose(spoilt[small], right[small], atol=5e-3)
        assert int(session.query("STAT:QUES:COND?")) & 8


def test_a_fault_of_one_instrument_leaves_the_other_alone() -> None:
    """By its resource name."""
    bench = inject(load_bench("workshop", 1), "no answer", resource="GPIB0::17::INSTR")
    manager = pyvisa.ResourceManager(simulated_visa(bench.world, bench.instruments))
    session: Any = manager.open_resource("GPIB0::16::INSTR", read_termination="\n")
    assert session.query("*IDN?")
    manager.close()
