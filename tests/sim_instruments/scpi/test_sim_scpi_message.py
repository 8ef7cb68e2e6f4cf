"""Program messages to units (IEEE 488.2 chapter 7, SCPI-1999 Vol. 1 chapters 6 to 8, from memory)."""

from __future__ import annotations

import string

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sim_instruments.scpi.element import block_data, number_parts
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.message import Unit, message_end, units


def unit(message: str) -> Unit:
    (found,) = units(message)
    assert isinstance(found, Unit), found
    return found


def trouble(message: str) -> int:
    (found,) = units(message)
    assert isinstance(found, ScpiError), found
    return found.number


@pytest.mark.parametrize(
    ("message", "header", "absolute", "query", "parameters"),
    [
        ("*IDN?", ("*IDN",), False, True, ()),
        ("SENS:FREQ:STAR 1 GHZ", ("SENS", "FREQ", "STAR"), False, False, ("1 GHZ",)),
        (":INIT", ("INIT",), True, False, ()),
        ("  freq?\tMAX  ", ("freq",), False, True, ("MAX",)),
        ("FORM REAL,64", ("FORM",), False, False, ("REAL", "64")),
        ("A 'x,y;z', (1,2;3) ,#14,;\"(", ("A",), False, False, ("'x,y;z'", "(1,2;3)", '#14,;"(')),
        ("A 'it''s'", ("A",), False, False, ("'it''s'",)),
        ("A #0;,\"'", ("A",), False, False, ("#0;,\"'",)),
        ("A #HfF, #q17 ,#B101", ("A",), False, False, ("#HfF", "#q17", "#B101")),
        ("SENS2:FREQ1 1", ("SENS2", "FREQ1"), False, False, ("1",)),
        ("A 1 E 3 HZ", ("A",), False, False, ("1 E 3 HZ",)),
        ("A\x011", ("A",), False, False, ("1",)),
    ],
)
def test_a_unit_is_taken_apart(message, header, absolute, query, parameters):
    assert unit(message) == Unit(header, absolute, query, parameters)


def test_units_are_cut_at_semicolons_and_empty_ones_are_nothing():
    assert [u.header[0] for u in units(";A 1;; *OPC? ;B 'a;b';")] == ["A", "*OPC", "B"]


@pytest.mark.parametrize(
    ("message", "number"),
    [
        ("@FREQ", -101),
        ("\xe9", -101),
        ("SETUP&", -101),
        ("FREQ &5", -101),
        ("FREQ\xa05", -101),
        ("5", -102),
        ("::FREQ", -102),
        ("SENS::FREQ", -102),
        ("FREQ:", -102),
        ("*", -102),
        ("FREQ??", -102),
        ("'abc'", -102),
        ("FREQ 1 2", -103),
        ("FREQ MIN 1", -103),
        ("FREQ 'a' 1", -103),
        ("FREQ (1) 2", -103),
        ("FREQ #11x2", -103),
        ("FREQ #H1 2", -103),
        ("FREQ 1 HZ 2", -103),
        ("FREQ 1,", -109),
        ("FREQ ,1", -109),
        ("FREQ 1,,2", -109),
        ('FREQ"1"', -111),
        ("FREQ,1", -111),
        ("FREQ#11x", -111),
        ("ABCDEFGHIJKLM 1", -112),
        ("FREQ +", -121),
        ("FREQ --5", -121),
        ("FREQ 1.2.3", -121),
        ("FREQ 1&", -121),
        ("FREQ #H1G", -121),
        ("FREQ #Q8", -121),
        ("FREQ #B2", -121),
        ("FREQ 1E32001", -123),
        ("FREQ " + "1" * 256, -124),
        ("FREQ 5 %", -131),
        ("FREQ 5 HZ&", -131),
        ("FREQ 5 ABCDEFGHIJKLM", -134),
        ("FREQ STA&", -141),
        ("FREQ ABCDEFGHIJKLM", -144),
        ("FREQ 'abc", -151),
        ("FREQ '\xe9'", -151),
        ("FREQ #13x", -161),
        ("FREQ #2a4abcd", -161),
        ("FREQ #x", -161),
        ("FREQ #", -161),
        ("FREQ (1", -171),
    ],
)
def test_each_malformed_kind_has_its_number(message, number):
    """Descriptions of SCPI-1999 Vol. 2, 21.8; limits of 12 characters, 255 digits, exponent 32000 there."""
    assert trouble(message) == number


def test_a_broken_unit_does_not_hide_those_after_it():
    found = units("@;*CLS;FREQ 1 2;*OPC?")
    assert [u.header[0] if isinstance(u, Unit) else u.number for u in found] == [-101, "*CLS", -103, "*OPC"]


@pytest.mark.parametrize(
    ("data", "whole", "end"),
    [
        (b"A\nB\n", False, 1),
        (b"A", False, None),
        (b"A", True, 1),
        (b"", True, None),
        (b"A #15a\nb\nc;B\nC\n", False, 12),
        (b"A #15a\nb", False, None),
        (b"A #2", False, None),
        (b'A "#15a\nb\n', False, 7),
        (b"A '#15';B\n", False, 9),
        (b"A#15\nb\n", False, 4),
        (b"A #0\n\n\n", False, 4),
        (b"A #0\n\n\n", True, 7),
        (b"A 1,#12\n\n\n", False, 9),
        (b"A #Q17\n", False, 6),
    ],
)
def test_where_a_message_ends(data, whole, end):
    assert message_end(bytearray(data), whole) == end


@pytest.mark.parametrize(
    ("element", "value"),
    [("1", 1), ("-.5", -0.5), ("+5.", 5), ("1e3", 1e3), ("1 E -3", 1e-3), ("#HFF", 255), ("#b11", 3)],
)
def test_numbers_have_their_value(element, value):
    assert number_parts(element) == (value, "")


_WORD = st.text(string.ascii_letters, min_size=1, max_size=12)
_HEADER = st.lists(_WORD, min_size=1, max_size=4).map(tuple)
_QUOTED = st.text(string.printable.replace("\n", ""), max_size=20)
_ELEMENT = st.one_of(
    _WORD,
    st.integers(-(10**9), 10**9).map(str),
    st.floats(allow_nan=False, allow_infinity=False).map(repr),
    _QUOTED.map(lambda s: "'" + s.replace("'", "''") + "'").filter(str.isprintable),
    st.binary(max_size=30).map(lambda b: f"#2{len(b):02d}" + b.decode("latin-1")),
    st.lists(st.integers(1, 9).map(str), max_size=4).map(lambda n: "(@" + ",".join(n) + ")"),
)
_UNIT = st.tuples(_HEADER, st.booleans(), st.booleans(), st.lists(_ELEMENT, max_size=5).map(tuple))


def _written(header, absolute, query, parameters):
    text = ":" * absolute + ":".join(header) + "?" * query
    return text + (" " + ",".join(parameters) if parameters else "")


@settings(max_examples=60, deadline=None)
@given(st.lists(_UNIT, min_size=1, max_size=4))
def test_what_is_written_by_the_rules_is_read_as_meant(meant):
    message = ";".join(_written(*one) for one in meant)
    assert units(message) == [Unit(*one) for one in meant]


@settings(max_examples=60, deadline=None)
@given(st.lists(_UNIT, min_size=1, max_size=3), st.integers(1, 7))
def test_a_message_ends_at_its_lf_however_it_arrives(meant, piece):
    message = ";".join(_written(*one) for one in meant).encode("latin-1")
    data = bytearray()
    for start in range(0, len(message), piece):
        data += message[start : start + piece]
        assert message_end(data, False) is None
    assert message_end(data + b"\nNEXT\n", False) == len(message)


@settings(max_examples=100, deadline=None)
@given(st.text(st.characters(max_codepoint=255, exclude_characters="\n"), max_size=60))
def test_anything_gives_units_or_command_errors(message):
    for found in units(message):
        assert isinstance(found, Unit) or -199 <= found.number <= -100


@given(st.binary(max_size=200))
def test_a_block_gives_its_bytes_back(payload):
    length = str(len(payload))
    element = f"#{len(length)}{length}" + payload.decode("latin-1")
    (parameter,) = unit("A " + element).parameters
    assert block_data(parameter) == payload
