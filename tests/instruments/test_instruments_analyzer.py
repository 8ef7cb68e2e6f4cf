"""The analyzer driver over a scripted instrument: what it says in each dialect, what it believes."""

from __future__ import annotations

import contextlib
import re
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from pyvisa.constants import StatusCode
from pyvisa.errors import VisaIOError

from benchrun.clock import FunctionClock
from benchrun.errors import (
    DeadlineExceeded,
    InputError,
    InstrumentError,
    InvalidMeasurement,
    ReplyError,
    TransportError,
)
from benchrun.instruments.analyzer import NetworkAnalyzer, SweepSettings
from benchrun.instruments.dialect import load_dialect
from benchrun.scpi.session import Session
from benchrun.scpi.transcript import Transcript

GRID = np.array([1e6, 2e6, 4e6])
SPAN = SweepSettings(np.linspace(1e6, 3e6, 3), "linear", 1000.0, -10.0)
NAMES = ("S11", "S21", "S12", "S22")


class Scripted:
    """An instrument made of replies, behind the seam of a PyVISA resource; every query has one answer."""

    resource_name = "GPIB0::16::INSTR"

    def __init__(self, width: str) -> None:
        self.width, self.now, self.session, self.visalib = width, 0.0, 1, self
        self.sent: list[str] = []
        self.errors: list[str] = []
        self.condition, self.polls, self.points = 0, 2, 3
        self.planes = {n: np.full(3, (i + 0.1) * (1 - 0.5j)) for i, n in enumerate(NAMES)}
        self.grid = SPAN.grid_hz
        self.buffer, self.clears, self.selected = b"", 0, "S11"
        self.override: Callable[[str], Any] = lambda _: None

    def write(self, message: str) -> None:
        self.sent.append(message)
        if feed := re.search(r'RATio (\d),(\d)"', message):
            self.selected = f"S{feed[1]}{feed[2]}"
        reply = self.override(message)
        self.buffer += self._reply(message) if reply is None else reply

    def _block(self, values: np.ndarray) -> bytes:
        data = np.asarray(values).astype(self.width).tobytes()
        return f"#{len(str(len(data)))}{len(data)}".encode() + data + b"\n"

    def _reply(self, message: str) -> bytes:
        if message.endswith("*OPC?"):
            return b"1\n"
        if message.startswith("SYST:ERR"):
            return (self.errors.pop(0) if self.errors else '0,"No error"').encode() + b"\n"
        if "POIN" in message and message.endswith("?"):
            return f"{self.points}\n".encode()
        if "OPERation:COND" in message:
            self.polls -= 1
            return b"8\n" if self.polls >= 0 else b"0\n"
        if "QUES" in message:
            return f"{self.condition}\n".encode()
        if message == "TRAC? MATRIX":
            rows = np.array([self.planes[n] for n in NAMES]).T.ravel()
            return self._block(np.column_stack([rows.real, rows.imag]).ravel())
        if message == "TRAC? GRID":
            return self._block(self.grid)
        if message == "CALCulate:DATA?":
            plane = self.planes[self.selected]
            return self._block(np.column_stack([plane.real, plane.imag]).ravel())
        return b""

    def read(self, _: int, count: int) -> tuple[bytes, StatusCode]:
        if not self.buffer:
            raise VisaIOError(StatusCode.error_timeout)
        lf = self.buffer.find(b"\n") + 1 if self.termchar else 0
        size = min(count, lf or count)
        data, self.buffer = self.buffer[:size], self.buffer[size:]
        return (
            data,
            StatusCode.success_termination_character_read
            if size == lf
            else StatusCode.success_max_count_read,
        )

    termchar = True

    def set_visa_attribute(self, _: object, value: bool) -> None:
        self.termchar = value

    def ignore_warning(self, *_: object) -> contextlib.AbstractContextManager[None]:
        return contextlib.nullcontext()

    def clear(self) -> None:
        self.clears += 1
        self.buffer = b""

    def close(self) -> None:
        pass

    def wait(self, seconds: float) -> None:
        self.now += seconds


WIDTHS = {"whole-matrix": ">f8", "one-reading": "<f4"}


def make(name: str) -> tuple[NetworkAnalyzer, Scripted]:
    wire = Scripted(WIDTHS[name])
    session = Session(wire, FunctionClock(lambda: wire.now, wire.wait), Transcript())
    return NetworkAnalyzer(session, load_dialect(name)), wire


@pytest.fixture(params=sorted(WIDTHS))
def pair(request):
    """An analyzer in each dialect, set up, and its instrument."""
    analyzer, wire = make(request.param)
    analyzer.set_up(SPAN)
    return analyzer, wire


def test_settings_in_the_words_of_one_dialect():
    analyzer, wire = make("whole-matrix")
    analyzer.preset()
    analyzer.set_up(SweepSettings(SPAN.grid_hz, "linear", 1234567.0, -10.25, 4))
    said = [m for m in wire.sent if not m.startswith("SYST:ERR")]
    assert said == [
        "*RST;*CLS;:INIT:CONT OFF;:TRIG:SOUR IMM;:FORM REAL,64;:FORM:BORD NORM;*OPC?",
        "SENS:FREQ:MODE SWE;:SENS:FREQ:STAR 1000000.0 HZ;:SENS:FREQ:STOP 3000000.0 HZ;:SENS:SWE:POIN 3;"
        ":SENS:SWE:SPAC LIN;:SENS:BAND 1234567 HZ;:SOUR:POW -10.25 DBM;:SENS:AVER:COUN 4;:SENS:AVER ON;*OPC?",
        "SENS:SWE:POIN?",
        "OUTP ON;*OPC?",
    ]


def test_settings_in_the_words_of_the_other_dialect():
    analyzer, wire = make("one-reading")
    analyzer.set_up(SweepSettings(GRID, "log", 1e3, -10.0))
    assert wire.sent[0].startswith("SENSe:FREQuency:MODE SWEep;:SENSe:FREQuency:STARt 1000000.0;")
    assert ":SENSe:SWEep:SPACing LOGarithmic;" in wire.sent[0]
    assert wire.sent[0].endswith(":SENSe:AVERage:COUNt 1;:SENSe:AVERage:STATe OFF;*OPC?")


@pytest.mark.parametrize("name", sorted(WIDTHS))
def test_a_list_is_sent_whole(name):
    analyzer, wire = make(name)
    analyzer.set_up(SweepSettings(np.array([1e6, 1.5e6, 1234567.125]), "list", 1e3, -10.0))
    assert re.search(r"LIST:FREQ(uency)? 1000000\.0,1500000\.0,1234567\.125;", wire.sent[0])
    assert "STAR" not in wire.sent[0]


def test_a_dialect_without_log_sweeps_is_given_the_list():
    analyzer, wire = make("whole-matrix")
    words = analyzer.dialect.sweep.model_copy(update={"log": ()})
    analyzer.dialect = analyzer.dialect.model_copy(update={"sweep": words})
    analyzer.set_up(SweepSettings(GRID, "log", 1e3, -10.0))
    assert "SENS:LIST:FREQ 1000000.0,2000000.0,4000000.0" in wire.sent[0]
    words = words.model_copy(update={"listed": ()})
    analyzer.dialect = analyzer.dialect.model_copy(update={"sweep": words})
    with pytest.raises(InputError, match="the dialect whole-matrix has no words for a log sweep"):
        analyzer.set_up(SweepSettings(GRID, "log", 1e3, -10.0))


def test_other_points_than_asked_are_refused():
    analyzer, wire = make("whole-matrix")
    wire.points = 2
    with pytest.raises(ReplyError, match="answered '2' where 3 points as set was expected"):
        analyzer.set_up(SPAN)
    assert "OUTP ON;*OPC?" not in wire.sent


def test_readings_come_back_exactly_as_sent(pair):
    analyzer, wire = pair
    readings = analyzer.sweep()
    kind = np.complex64 if wire.width == "<f4" else np.complex128
    for name in NAMES:
        np.testing.assert_array_equal(
            readings.raw.parameter(name), wire.planes[name].astype(kind).astype(complex)
        )
    np.testing.assert_array_equal(readings.f_hz, SPAN.grid_hz)


def test_sweeping_before_setting_up_is_a_fault_of_the_program():
    analyzer, _ = make("one-reading")
    with pytest.raises(RuntimeError, match="set_up"):
        analyzer.sweep()


def test_the_sweeping_condition_is_polled_until_it_falls():
    analyzer, wire = make("one-reading")
    analyzer.set_up(SPAN)
    wire.polls = 7
    analyzer.sweep()
    assert wire.now == pytest.approx(7 * SPAN.expected_s / 20)


def test_a_sweep_that_never_ends_misses_its_deadline():
    analyzer, wire = make("one-reading")
    analyzer.set_up(SPAN)
    wire.polls = 10**9
    with pytest.raises(DeadlineExceeded, match="is still sweeping after") as caught:
        analyzer.sweep()
    assert caught.value.elapsed_s > SPAN.deadline_s
    assert "INITiate:IMMediate" in caught.value.request


def test_a_sweep_that_never_completes_misses_its_deadline():
    analyzer, wire = make("whole-matrix")
    analyzer.set_up(SPAN)
    wire.override = lambda m: b"" if m.startswith("INIT") else None
    with pytest.raises(DeadlineExceeded, match=r"after 'INIT;\*OPC\?'"):
        analyzer.sweep()
    assert wire.now == pytest.approx(SPAN.deadline_s)


def test_an_instrument_error_names_the_trigger(pair):
    analyzer, wire = pair
    wire.errors = ['-213,""']
    with pytest.raises(
        InstrumentError,
        match=r"after '(INIT|ABORt;:INITiate:IMMediate)': reported error -213, \"Init ignored\"",
    ):
        analyzer.sweep()


@pytest.mark.parametrize("grid", [[1e6, 2e6, 3.00001e6], [1e6, np.nan, 3e6], [2e6, 3e6, 4e6]])
def test_another_grid_is_an_invalid_measurement(grid):
    analyzer, wire = make("whole-matrix")
    analyzer.set_up(SPAN)
    wire.grid = np.array(grid)
    with pytest.raises(InvalidMeasurement, match="swept another grid: point"):
        analyzer.sweep()


@pytest.mark.parametrize(
    ("bits", "trouble"), [(8, "an overload"), (32, "an unlocked reference"), (40, "an overload")]
)
def test_what_spoils_a_reading_makes_it_invalid(pair, bits, trouble):
    analyzer, wire = pair
    wire.condition = bits
    with pytest.raises(InvalidMeasurement, match=f"reports {trouble} in this sweep"):
        analyzer.sweep()


def test_other_condition_bits_spoil_nothing(pair):
    analyzer, wire = pair
    wire.condition = 1 << 8
    assert analyzer.health() == []


@pytest.mark.parametrize("bad", [9.91e37, complex(0, 9.91e37), complex(np.nan, 0), -9.9e37])
def test_no_number_makes_a_reading_invalid(pair, bad):
    analyzer, wire = pair
    wire.planes["S12"][1] = bad
    with pytest.raises(InvalidMeasurement, match=r"gave no number for S12 at 2 MHz \(1 points\)"):
        analyzer.sweep()


def test_the_same_digits_twice_are_stale(pair):
    analyzer, wire = pair
    analyzer.sweep()
    with pytest.raises(InvalidMeasurement, match="the very same readings as before"):
        analyzer.sweep()
    wire.planes["S21"] = wire.planes["S21"] + 1e-3
    analyzer.sweep()


def test_the_same_digits_under_new_settings_are_stale_too(pair):
    analyzer, _ = pair
    analyzer.sweep()
    analyzer.set_up(SweepSettings(SPAN.grid_hz, "linear", 1000.0, -10.0))
    with pytest.raises(InvalidMeasurement, match="the very same readings as before"):
        analyzer.sweep()


def test_another_grid_is_another_reading(pair):
    analyzer, wire = pair
    analyzer.sweep()
    wire.points, wire.grid = 2, SPAN.grid_hz[:2]
    wire.planes = {name: plane[:2] for name, plane in wire.planes.items()}
    analyzer.set_up(SweepSettings(SPAN.grid_hz[:2], "linear", 1000.0, -10.0))
    analyzer.sweep()


def test_recordings_may_be_served_twice(pair):
    analyzer, _ = pair
    analyzer.replayed = True
    analyzer.sweep()
    analyzer.sweep()


def test_a_half_read_block_does_not_keep_the_source_on(pair):
    analyzer, wire = pair
    wire.override = lambda m: b"#3999" + bytes(20) if m.startswith(("TRAC?", "CALCulate:DATA")) else None
    with pytest.raises(TransportError):
        analyzer.sweep()
    wire.buffer = b"1\n0\n"  # late remains that look like answers
    assert analyzer.make_safe() == ""
    assert wire.clears == 1
    assert re.match(r"OUTP(ut:STATe 0| OFF);\*OPC\?", wire.sent[-2])


def test_an_old_error_does_not_keep_the_source_on(pair):
    analyzer, wire = pair
    wire.errors = ['-222,"Data out of range"']
    assert analyzer.make_safe() == ""


def test_a_source_that_cannot_be_reached_is_told(pair):
    analyzer, wire = pair
    wire.override = lambda _: b""
    said = analyzer.make_safe()
    assert said.startswith("the source of GPIB0::16::INSTR may still be on (")
    assert said.endswith("switch it off by hand")
