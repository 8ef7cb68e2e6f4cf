"""Values with units: what is read, what is refused, and with which words."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchrun.quantity import Dimension, QuantityError, parse, parse_range, render

D = Dimension


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("10 MHz", D.FREQUENCY, 10e6),
        ("10MHz", D.FREQUENCY, 10e6),
        ("  169.4  MHz ", D.FREQUENCY, 169.4e6),
        ("1.2 GHz", D.FREQUENCY, 1.2e9),
        ("915 kHz", D.FREQUENCY, 915e3),
        ("0.11 THz", D.FREQUENCY, 110e9),
        ("50 Hz", D.FREQUENCY, 50.0),
        ("1e3 kHz", D.FREQUENCY, 1e6),
        (".5 GHz", D.FREQUENCY, 0.5e9),
        ("5. GHz", D.FREQUENCY, 5e9),
        ("-10 dBm", D.POWER, -10.0),
        ("+3 dBm", D.POWER, 3.0),
        ("0.45 dB", D.RATIO, 0.45),
        ("20 ms", D.TIME, 0.02),
        ("8 h", D.TIME, 28800.0),
        ("15 min", D.TIME, 900.0),
        ("2 d", D.TIME, 172800.0),
        ("1.5 sec", D.TIME, 1.5),
        ("33 ps", D.TIME, 33e-12),
        ("50 ohm", D.IMPEDANCE, 50.0),
        ("50 Ω", D.IMPEDANCE, 50.0),
        ("2 kohm", D.IMPEDANCE, 2000.0),
        ("25 mm", D.LENGTH, 0.025),
        ("23 °C", D.TEMPERATURE, 23.0),
        ("0.9 N m", D.TORQUE, 0.9),
        ("0.9 N*m", D.TORQUE, 0.9),
        ("0.9 Nm", D.TORQUE, 0.9),
        ("5 V", D.VOLTAGE, 5.0),
        ("120 mA", D.CURRENT, 0.12),
        ("10 °", D.ANGLE, 10.0),
        ("-170 deg", D.ANGLE, -170.0),
        ("50 fF", D.CAPACITANCE, 50e-15),
        ("0.3 pF", D.CAPACITANCE, 0.3e-12),
        ("2 pH", D.INDUCTANCE, 2e-12),
        ("12 µH", D.INDUCTANCE, 12e-6),
        ("12 μH", D.INDUCTANCE, 12e-6),
        ("12 uH", D.INDUCTANCE, 12e-6),
        ("5 %", D.PERCENT, 5.0),
        ("1.3 Gohm/s", D.LOSS_RATE, 1.3e9),
        ("1.5", D.NUMBER, 1.5),
        ("-2e-3", D.NUMBER, -0.002),
    ],
)
def test_a_value_is_read_exactly(text: str, dimension: Dimension, value: float) -> None:
    """Bit for bit: "0.3 pF" is the double nearest to 0.3e-12, not 0.3 times 1e-12."""
    assert parse(text, dimension) == value


@pytest.mark.parametrize("dimension", list(D), ids=lambda d: d.name)
def test_every_dimension_reads_its_own_example(dimension: Dimension) -> None:
    """The example that every complaint shows must itself be right."""
    assert math.isfinite(parse(dimension.example, dimension))


@pytest.mark.parametrize("dimension", [d for d in D if d.unit], ids=lambda d: d.name)
@pytest.mark.parametrize("bare", ["10", 10, 10.5, True, None, [1]])
def test_a_bare_number_is_refused(bare: object, dimension: Dimension) -> None:
    """The next reader cannot tell what was meant."""
    with pytest.raises(QuantityError, match="has no unit; write it as in") as caught:
        parse(bare, dimension)
    assert dimension.example in str(caught.value)


@pytest.mark.parametrize("dimension", [d for d in D if d.unit], ids=lambda d: d.name)
def test_every_dimension_refuses_another_ones_unit(dimension: Dimension) -> None:
    with pytest.raises(QuantityError, match="is not in"):
        parse("3 furlong", dimension)


def test_a_plain_number_carries_no_unit() -> None:
    with pytest.raises(QuantityError, match="carries a unit where a plain number is wanted"):
        parse("1.5 dB", D.NUMBER)


def test_power_is_not_a_ratio() -> None:
    """A level in dB is no power, and one in dBm no loss: the commonest slip of all."""
    with pytest.raises(QuantityError, match="is not in dBm"):
        parse("-10 dB", D.POWER)
    with pytest.raises(QuantityError, match="is not in dB"):
        parse("3 dBm", D.RATIO)


@pytest.mark.parametrize("text", ["169.4 mHz", "1600 mHz", "0 mHz"])
def test_millihertz_is_taken_for_the_slip_that_it_is(text: str) -> None:
    with pytest.raises(QuantityError, match=r'm is milli.*did you mean "MHz"'):
        parse(text, D.FREQUENCY)


@pytest.mark.parametrize(
    ("text", "dimension"),
    [("120 MA", D.CURRENT), ("5 MV", D.VOLTAGE), ("20 Ms", D.TIME), ("25 Mm", D.LENGTH),
     ("3 GF", D.CAPACITANCE), ("2 TH", D.INDUCTANCE)],
)  # fmt: skip
def test_mega_is_refused_where_milli_was_meant(text: str, dimension: Dimension) -> None:
    """A supply limit of 120 million amperes would protect nothing."""
    with pytest.raises(QuantityError, match="M is mega"):
        parse(text, dimension)


@pytest.mark.parametrize(
    ("text", "dimension", "meant"),
    [
        ("10 mhz", D.FREQUENCY, "MHz"),
        ("10 MHZ", D.FREQUENCY, "MHz"),
        ("10 ghz", D.FREQUENCY, "GHz"),
        ("10 KHz", D.FREQUENCY, "kHz"),
        ("10 hz", D.FREQUENCY, "Hz"),
        ("10 MS", D.TIME, "ms"),
        ("120 ma", D.CURRENT, "mA"),
        ("10 PF", D.CAPACITANCE, "pF"),
        ("-10 DBM", D.POWER, "dBm"),
        ("3 db", D.RATIO, "dB"),
    ],
)
def test_wrong_capitals_bring_the_right_ones(text: str, dimension: Dimension, meant: str) -> None:
    with pytest.raises(QuantityError, match=f'did you mean "{meant}"'):
        parse(text, dimension)


@pytest.mark.parametrize(
    "text",
    [
        "", " ", "MHz", "ten MHz", "1,5 MHz", "1_0 MHz", "0x10 MHz", "nan MHz", "inf MHz", "--1 MHz",
        "1e MHz",
        "1 2 MHz", "10 M\nHz", "10 MHz\n;DROP", "１０ MHz", "1.2.3 MHz", "∞ Hz", "10 MHz MHz", "10 dMHz",
    ],
)  # fmt: skip
def test_hostile_text_is_refused_in_words(text: str) -> None:
    with pytest.raises(QuantityError):
        parse(text, D.FREQUENCY)


@pytest.mark.parametrize("text", ["1e400 Hz", "9e307 GHz", "-1e999 Hz"])
def test_a_value_beyond_floating_point_is_refused(text: str) -> None:
    with pytest.raises(QuantityError, match="too large"):
        parse(text, D.FREQUENCY)


@settings(deadline=None, max_examples=300)
@given(st.text(max_size=60), st.sampled_from(list(D)))
def test_any_text_gives_a_finite_value_or_one_error(text: str, dimension: Dimension) -> None:
    try:
        value = parse(text, dimension)
    except QuantityError:
        return
    assert math.isfinite(value)


def test_a_long_text_takes_no_long_time() -> None:
    """No backtracking: 200 000 characters are refused at once."""
    for text in (
        "1" * 200_000 + "x" * 200_000,
        " " * 200_000 + "1",
        "1" + " " * 200_000 + "\n1",
        "1e" * 100_000,
    ):
        with pytest.raises(QuantityError):
            parse(text, D.FREQUENCY)


@settings(deadline=None, max_examples=200)
@given(
    st.sampled_from([D.FREQUENCY, D.IMPEDANCE, D.LOSS_RATE]),
    st.floats(1.0, 9e11),
)
def test_what_is_rendered_reads_back_large(dimension: Dimension, value: float) -> None:
    """To the digits that were shown."""
    assert parse(render(value, dimension, 6), dimension) == pytest.approx(value, rel=1e-5)


@settings(deadline=None, max_examples=200)
@given(
    st.sampled_from([D.TIME, D.LENGTH, D.CURRENT, D.VOLTAGE, D.CAPACITANCE, D.INDUCTANCE]),
    st.floats(1e-14, 9e4),
    st.sampled_from([1.0, -1.0]),
)
def test_what_is_rendered_reads_back_small(dimension: Dimension, value: float, sign: float) -> None:
    assert parse(render(sign * value, dimension, 6), dimension) == pytest.approx(sign * value, rel=1e-5)


@settings(deadline=None, max_examples=200)
@given(
    st.sampled_from([d for d in D if not d.scaled and d is not D.NUMBER]),
    st.floats(-999.0, 999.0),
)
def test_what_is_rendered_reads_back_in_decibels(dimension: Dimension, value: float) -> None:
    """Unscaled units show three decimals."""
    assert parse(render(value, dimension, 6), dimension) == pytest.approx(value, abs=0.000501)


@pytest.mark.parametrize(
    ("value", "dimension", "text"),
    [
        (169.4e6, D.FREQUENCY, "169.4 MHz"),
        (0.0, D.FREQUENCY, "0 Hz"),
        (1e9, D.FREQUENCY, "1 GHz"),
        (-0.456, D.RATIO, "-0.456 dB"),
        (-0.0004, D.RATIO, "0 dB"),
        (1.22222, D.NUMBER, "1.222"),
        (2.5e-4, D.NUMBER, "0.00025"),
        (-0.0, D.NUMBER, "0"),
        (50e-15, D.CAPACITANCE, "50 fF"),
        (math.nan, D.RATIO, "nan"),
        (math.inf, D.FREQUENCY, "inf"),
    ],
)
def test_rendering_is_for_people(value: float, dimension: Dimension, text: str) -> None:
    assert render(value, dimension) == text


@pytest.mark.parametrize(
    ("text", "low", "high"),
    [
        ("160 MHz to 175 MHz", 160e6, 175e6),
        ("900 kHz  to  1.2 GHz", 900e3, 1.2e9),
    ],
)
def test_a_range_is_two_values(text: str, low: float, high: float) -> None:
    assert parse_range(text, D.FREQUENCY) == (low, high)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("160 to 175 MHz", "has no unit"),
        ("160 MHz", "is not a range"),
        ("160 MHz - 175 MHz", "is not a range"),
        ("1 MHz to 2 MHz to 3 MHz", "is not a range"),
        (175e6, "is not a range"),
        ("175 MHz to 160 MHz", "does not increase"),
        ("160 MHz to 160 MHz", "does not increase"),
        ("160 MHz to 175 mHz", "milli"),
    ],
)
def test_a_wrong_range_is_refused(text: object, words: str) -> None:
    with pytest.raises(QuantityError, match=words):
        parse_range(text, D.FREQUENCY)
