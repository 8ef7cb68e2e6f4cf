"""Data elements to values (SCPI-1999 Vol. 1 chapter 7, from memory; error numbers of Vol. 2, 21.8)."""

from __future__ import annotations

import pytest

from sim_instruments.scpi.errors import TEXTS, ScpiError, event_bit
from sim_instruments.scpi.parameters import FREQUENCY, TIME, boolean, choice, number, short, string, whole


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1", 1.0), ("1HZ", 1.0), ("1 kHz", 1e3), ("2.5MHZ", 2.5e6), ("2.5 MAHZ", 2.5e6), ("1e-3GHz", 1e6),
        ("MIN", 0.0), ("minimum", 0.0), ("MAX", 1e10), ("DEF", 7.0), ("DEFault", 7.0), ("#HFF", 255.0),
    ],
)  # fmt: skip
def test_a_frequency(text, value):
    assert number(text, 0.0, 1e10, FREQUENCY, 7.0) == pytest.approx(value, rel=1e-15)


def test_m_is_milli_but_for_hertz():
    assert number("5 MS", 0, 1, TIME) == pytest.approx(5e-3)
    assert number("5 MHZ", 0, 1e9, FREQUENCY) == 5e6


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("1 V", -131), ("11 GHZ", -222), ("-1", -222), ("1e999", -222), ("#HFFFFFFFFFFFFF", -222),
        ("#H" + "F" * 400, -222), ("FOO", -141), ("MINI", -141), ("UP", -141), ("'1'", -158), ("#11x", -168),
        ("(1)", -178),
    ],
)  # fmt: skip
def test_what_is_no_frequency_says_why(text, code):
    with pytest.raises(ScpiError) as caught:
        number(text, 0.0, 1e10, FREQUENCY)
    assert caught.value.number == code


def test_a_unit_where_there_is_none_and_a_default_where_there_is_none():
    with pytest.raises(ScpiError) as caught:
        number("1 HZ", 0, 10)
    assert caught.value.number == -138
    with pytest.raises(ScpiError) as caught:
        number("DEF", 0, 10)
    assert caught.value.number == -141


def test_whole_numbers_are_rounded_before_they_are_judged():
    assert whole("254.6", 0, 255) == 255
    assert whole("1.4e1", 0, 255) == 14
    with pytest.raises(ScpiError) as caught:
        whole("255.6", 0, 255)
    assert caught.value.number == -222


@pytest.mark.parametrize(
    ("text", "value"),
    [("ON", True), ("off", False), ("1", True), ("0.4", False), ("-7", True), ("#B1", True)],
)
def test_a_switch(text, value):
    assert boolean(text) is value


@pytest.mark.parametrize(("text", "code"), [("MAYBE", -141), ("MIN", -141), ("'ON'", -158), ("1e9", -222)])
def test_what_is_no_switch_says_why(text, code):
    with pytest.raises(ScpiError) as caught:
        boolean(text)
    assert caught.value.number == code


@pytest.mark.parametrize("text", ["LIN", "lin", "LINEAR", "Linear"])
def test_a_keyword_in_short_or_long_form(text):
    assert choice(text, "LINear", "LOGarithmic") == "LINear"


@pytest.mark.parametrize(
    ("text", "code"),
    [("LINE", -224), ("LI", -224), ("1", -128), ("'LIN'", -158), ("#11x", -168), ("(A)", -178)],
)
def test_what_is_no_keyword_says_why(text, code):
    with pytest.raises(ScpiError) as caught:
        choice(text, "LINear", "LOGarithmic")
    assert caught.value.number == code


@pytest.mark.parametrize(("text", "code"), [("1", -128), ("ABC", -148), ("#11x", -168), ("(A)", -178)])
def test_what_is_no_string_says_why(text, code):
    with pytest.raises(ScpiError) as caught:
        string(text)
    assert caught.value.number == code


def test_quotes_within_a_string_are_doubled():
    assert string('"say ""no"""') == 'say "no"'
    assert string("'a\"b'") == 'a"b'


@pytest.mark.parametrize(
    ("long", "form"),
    [("FREQuency", "FREQ"), ("POINts", "POIN"), ("POWer", "POW"), ("MODE", "MODE"), ("ASCii", "ASC")],
)
def test_the_short_form_is_in_capitals(long, form):
    assert short(long) == form


def test_entries_of_the_queue_hold_the_standards_text():
    assert ScpiError(-113, 'SENS:"X"').entry == "-113,\"Undefined header;SENS:'X'\""
    assert ScpiError(0).entry == '0,"No error"'
    assert len(ScpiError(-222, "9" * 400).entry) == len('-222,""') + 255


def test_each_class_of_numbers_has_its_bit():
    """SCPI-1999 Vol. 2, 21.8.4 and after: command 5, execution 4, device 3, query 2, and the events."""
    bits = {1: 32, 2: 16, 3: 8, 4: 4, 5: 128, 6: 64, 7: 2, 8: 1}
    for code in TEXTS:
        if code:
            assert event_bit(code) == bits[-code // 100]
    assert event_bit(101) == 8
