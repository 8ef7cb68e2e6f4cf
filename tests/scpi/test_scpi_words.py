"""The standard's words: keywords in short and long form, texts of error numbers, status codes."""

from __future__ import annotations

import socket
from types import SimpleNamespace

import pytest
from pyvisa.constants import StatusCode
from pyvisa.errors import VisaIOError

from benchrun.errors import TransportError
from benchrun.scpi.error_texts import ERROR_TEXTS, standard_text
from benchrun.scpi.faults import CODES, is_dead, translate
from benchrun.scpi.keywords import compound, matches, short_form

FORMS = [
    "FREQuency=FREQ", "STARt=STAR", "POINts=POIN", "TIME=TIME", "TRACe=TRAC", "VOLTage=VOLT",
    "BANDwidth=BAND",
    "ASCii=ASC", "ERRor=ERR", "DELay=DEL", "COUNt=COUN", "LEVel=LEV", "SLOPe=SLOP", "POSitive=POS",
    "IMAGinary=IMAG", "SYSTem=SYST", "SENSe=SENS", "FORMat=FORM", "BORDer=BORD", "MODE=MODE", "CENTer=CENT",
    "SPAN=SPAN", "POWer=POW", "TRIGger=TRIG", "AVERage=AVER", "SWEep=SWE", "SOURce=SOUR", "IMMediate=IMM",
]  # fmt: skip


@pytest.mark.parametrize(("keyword", "short"), [form.split("=") for form in FORMS])
def test_short_forms(keyword, short):
    """SCPI-1999 Volume 1, 6.2.1: the capitals of each keyword are its short form."""
    assert short_form(keyword) == short
    for written in (short, short.lower(), keyword, keyword.upper(), keyword.lower()):
        assert matches(keyword, written) == 1


@pytest.mark.parametrize(
    "written", ["FREQU", "FRE", "F", "", "FREQUENCYS", "FREQ-1", "FREQ 1", "2FREQ", "FREQ:1"]
)
def test_nothing_between_short_and_long_is_a_keyword(written):
    assert matches("FREQuency", written) is None


@pytest.mark.parametrize(
    ("written", "suffix"), [("CALC2", 2), ("calculate12", 12), ("Calc", 1), ("CALC0", 0)]
)
def test_numeric_suffixes(written, suffix):
    assert matches("CALCulate", written) == suffix


def test_compound_messages_start_each_unit_at_the_root():
    assert compound("INIT:CONT OFF") == "INIT:CONT OFF"
    assert compound(":A:B 1", "A:C 2", "*WAI", ":D") == "A:B 1;:A:C 2;*WAI;:D"


def test_the_table_of_error_texts_is_whole():
    """The numbers of SCPI-1999 Volume 2, 21.8, by class."""
    by_class = {k: sum(1 for n in ERROR_TEXTS if n // -100 == k) for k in range(1, 9)}
    assert by_class == {1: 40, 2: 55, 3: 17, 4: 5, 5: 1, 6: 1, 7: 1, 8: 1}
    assert ERROR_TEXTS[0] == "No error"
    assert len(ERROR_TEXTS) == 122


@pytest.mark.parametrize(
    ("number", "text"),
    [
        (-100, "Command error"),
        (-109, "Missing parameter"),
        (-113, "Undefined header"),
        (-222, "Data out of range"),
        (-226, "Lists not same length"),
        (-294, "Incompatible type"),
        (-350, "Queue overflow"),
        (-410, "Query INTERRUPTED"),
        (-440, "Query UNTERMINATED after indefinite response"),
        (-800, "Operation complete"),
        (-199, "Command error"),
        (-299, "Execution error"),
        (-399, "Device-specific error"),
        (-1000, "unknown to the standard"),
        (105, "of the instrument's own, see its manual"),
    ],
)
def test_error_texts(number, text):
    assert standard_text(number) == text


@pytest.mark.parametrize("status", [s for s in StatusCode if s.value < 0], ids=lambda s: s.name)
def test_every_status_of_visa_has_a_translation(status):
    fault = translate(VisaIOError(status), "GPIB0::1::INSTR", "Q?", 1.0, 2.0)
    assert isinstance(fault, TransportError)
    assert type(fault) is CODES.get(status, TransportError)
    assert "; " in str(fault)  # an advice follows


class _Wire(socket.socket):
    def __init__(self, answer):
        super().__init__()
        self.answer = answer

    def recv(self, *_):
        if isinstance(self.answer, Exception):
            raise self.answer
        return self.answer


@pytest.mark.parametrize(
    ("answer", "dead"),
    [(b"", True), (b"x", False), (BlockingIOError(), False), (ConnectionResetError(), True)],
)
def test_a_dead_socket_is_told_from_a_slow_one(answer, dead):
    with _Wire(answer) as wire:
        sessions = {7: SimpleNamespace(interface=wire)}
        assert is_dead(SimpleNamespace(session=7, visalib=SimpleNamespace(sessions=sessions))) is dead


@pytest.mark.parametrize(
    "resource", [object(), SimpleNamespace(session=7, visalib=SimpleNamespace(sessions={}))]
)
def test_what_is_no_socket_is_never_called_dead(resource):
    assert is_dead(resource) is False
