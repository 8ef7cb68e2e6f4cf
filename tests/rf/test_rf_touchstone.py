"""Touchstone text: everything that version 1 allows is read, everything else is refused with its place.

Rules: IBIS Open Forum, Touchstone File Format Specification 2.0 (2009).
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from benchrun.errors import InputError
from benchrun.rf.touchstone import read, write
from benchrun.rf.twoport import TwoPort

ROW = "1 .1 .01 .21 .02 .12 .03 .22 .04"


def one_port(text: str) -> np.ndarray:
    return read(text.encode(), "a.s1p").s[:, 0, 0]


def refused(text: str | bytes, name: str = "a.s2p") -> str:
    with pytest.raises(InputError) as caught:
        read(text if isinstance(text, bytes) else text.encode(), name)
    return str(caught.value)


def test_two_ports_come_in_the_order_11_21_12_22() -> None:
    """The trap of version 1: S21 stands before S12."""
    data = read(f"# MHz S RI R 50\n{ROW}\n".encode(), "a.s2p")
    assert_array_equal(data.s[0], [[0.1 + 0.01j, 0.12 + 0.03j], [0.21 + 0.02j, 0.22 + 0.04j]])
    assert_array_equal(data.two_port.s21, [0.21 + 0.02j])
    assert data.ports == 2


def test_a_one_port_stands_in_s11_alone() -> None:
    data = read(b"# Hz S RI R 75\n1 .5 .25\n", "a.s1p")
    assert (data.ports, data.z0_ohm) == (1, 75.0)
    assert_array_equal(data.two_port.matrix, [[[0.5 + 0.25j, 0], [0, 0]]])


@pytest.mark.parametrize(
    ("form", "pair", "value"),
    [
        ("RI", "0.3 -0.4", 0.3 - 0.4j),
        ("MA", "0.5 90", 0.5j),
        ("MA", "2 180", -2.0),
        ("MA", "-0.5 0", -0.5),
        ("DB", "-20 0", 0.1),
        ("DB", "-6.020599913279624 -90", -0.5j),
    ],
)
def test_the_three_formats(form: str, pair: str, value: complex) -> None:
    """Angles in degrees, DB = 20 log10 of the magnitude."""
    assert_allclose(one_port(f"# GHz S {form} R 50\n1 {pair}\n"), [value], atol=1e-15)


@pytest.mark.parametrize(("unit", "scale"), [("Hz", 1.0), ("kHz", 1e3), ("MHz", 1e6), ("GHz", 1e9)])
def test_the_four_units_in_any_capitals(unit: str, scale: float) -> None:
    for spelt in (unit, unit.lower(), unit.upper()):
        assert read(f"# {spelt} S RI R 50\n2.5 0 0\n".encode(), "a.s1p").f_hz[0] == 2.5 * scale


@pytest.mark.parametrize(
    ("option", "expected"),
    [
        ("#", (1e9, 50.0, 0.5j)),
        ("# R 75", (1e9, 75.0, 0.5j)),
        ("# r 25 ri s mhz", (1e6, 25.0, 0.5 + 90j)),
        ("# RI", (1e9, 50.0, 0.5 + 90j)),
        ("  #\tHz\tS\tMA\tR\t50 ! as saved", (1.0, 50.0, 0.5j)),
        ("#Hz S MA R 50", (1.0, 50.0, 0.5j)),
    ],
)
def test_the_option_line_in_any_order_with_defaults(option: str, expected) -> None:
    """Default GHz, S, MA, 50 ohm."""
    data = read(f"! first a comment\n\n{option}\n1 .5 90\n".encode(), "a.s1p")
    assert (data.f_hz[0], data.z0_ohm) == expected[:2]
    assert_allclose(data.s[0, 0, 0], expected[2], atol=1e-15)


def test_only_the_first_option_line_counts() -> None:
    data = read(b"# Hz S RI R 50\n1 0 0\n# GHz S MA R 75\n2 1 0\n", "a.s1p")
    assert_array_equal(data.f_hz, [1.0, 2.0])
    assert data.z0_ohm == 50.0


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("last", [True, False])
def test_any_line_ends(end: str, last: bool) -> None:
    text = end.join(["! c", "# Hz S RI R 50", "1 0 0", "2 1 0"]) + (end if last else "")
    assert_array_equal(one_port(text), [0, 1])


def test_comments_blank_lines_tabs_and_a_byte_order_mark() -> None:
    odd = "\ufeff! \u00b5 \u2028 \x0c not a new line 9 9 9\n\n"
    text = odd + "# Hz S RI R 50 ! option\n\n\t1\t.5\t.5 ! point\n   \n! end"
    assert_array_equal(one_port(text), [0.5 + 0.5j])


def test_one_frequency_over_several_lines() -> None:
    text = "# Hz S RI R 50\n1 .1 .01 .21 .02\n .12 .03 .22 .04\n2 0 0 0 0\n0 0 0 0\n"
    data = read(text.encode(), "a.s2p")
    assert_array_equal(data.f_hz, [1.0, 2.0])
    assert_array_equal(data.two_port.s12, [0.12 + 0.03j, 0])


def test_names_in_capitals() -> None:
    assert read(f"# MHz S RI R 50\n{ROW}\n".encode(), "UNIT.S2P").ports == 2


NOISE = f"# GHz S MA R 50\n{ROW}\n22 0 0 0 0 0 0 0 0\n"


def test_a_noise_block_is_left_aside() -> None:
    """It begins where frequency falls back, with five numbers a line."""
    data = read(f"{NOISE}! noise\n4 .7 .64 69 .38\n18 2.7 .46 -33 .40\n".encode(), "a.s2p")
    assert_array_equal(data.f_hz, [1e9, 22e9])


def test_a_noise_block_may_start_at_the_last_frequency() -> None:
    """The specification says "less than or equal"."""
    assert len(read(f"{NOISE}22 .7 .64 69 .38\n".encode(), "a.s2p").f_hz) == 2


@pytest.mark.parametrize(
    ("tail", "words"),
    [
        ("4 .7 .64 69 .38\n3 2.7 .46 -33 .40\n", "a.s2p:5:1: is no line of noise data"),
        ("4 .7 .64 69 .38\n  18 2.7 .46 -33\n", "a.s2p:5:3: is no line of noise data"),
        ("4 .7 .64 69 .38\n5 0 0 0 0 0 0 0 0\n", "a.s2p:5:1: is no line of noise data"),
        ("4 0 0 0 0\n0 0 0 0\n", "a.s2p:5:1: is no line of noise data"),
    ],
)
def test_disorder_is_never_taken_for_noise(tail: str, words: str) -> None:
    """Frequencies out of order in a file with wrapped lines must not silently end it."""
    assert refused(NOISE + tail).startswith(words)


COMPLAINTS = [
    ("cut in a row", "# Hz S RI R 50\n1 0 0\n2 .5\n",
     "a.s1p", "a.s1p:4:1: ends in the middle of a frequency: 2 of 3"),
    ("cut two-port", f"# Hz S RI R 50\n{ROW}\n2 .5 .1",
     "a.s2p", "a.s2p:3:1: ends in the middle of a frequency: 3 of 9"),
    ("nan", "# Hz S RI R 50\n1 0 0\n2 nan 0\n", "a.s1p", "a.s1p:3:3: 'nan' is not a finite number"),
    ("inf", "# Hz S RI R 50\n1 0 -INF\n", "a.s1p", "a.s1p:2:5: '-INF' is not a finite number"),
    ("huge", "# Hz S RI R 50\n1 0 1e999\n", "a.s1p", "a.s1p:2:5: '1e999' is too large"),
    ("huge dB", "# Hz S DB R 50\n1 1e6 0\n", "a.s1p", "a.s1p:3:1: holds a magnitude too large"),
    ("huge f", "# GHz S RI R 50\n1e300 0 0\n", "a.s1p", "a.s1p:2:1: 1e+300 is no frequency"),
    ("negative f", "# Hz S RI R 50\n -1 0 0\n", "a.s1p", "a.s1p:2:2: -1 is no frequency"),
    ("order", "# Hz S RI R 50\n2 0 0\n1 0 0\n", "a.s1p", "a.s1p:3:1: frequency 1 does not increase"),
    ("twice", "# Hz S RI R 50\n2 0 0\n\n 2 0 0\n", "a.s1p", "a.s1p:4:2: frequency 2 does not increase"),
    ("order, two", f"# Hz S RI R 50\n2{ROW[1:]}\n{ROW}\n",
     "a.s2p", "a.s2p:3:1: frequency 1 does not increase"),
    ("Y", "# Hz Y RI R 50\n1 0 0\n", "a.s1p", "a.s1p:1:6: holds Y-parameters"),
    ("Z", "! c\n# Hz z RI R 50\n1 0 0\n", "a.s1p", "a.s1p:2:6: holds Z-parameters"),
    ("H", "# Hz H RI R 50\n", "a.s2p", "a.s2p:1:6: holds H-parameters"),
    ("G", "#\tG Hz RI R 50\n", "a.s2p", "a.s2p:1:3: holds G-parameters"),
    ("option", "# Hz S RI R 50 foo\n1 0 0\n", "a.s1p", "a.s1p:1:16: 'foo' means nothing in an option line"),
    ("R alone", "# Hz S RI R\n1 0 0\n", "a.s1p", "a.s1p:1:11: 'r' means nothing in an option line"),
    ("R word", "# Hz S RI R fifty\n1 0 0\n", "a.s1p", "a.s1p:1:13: 'fifty' is not a number"),
    ("R zero", "# Hz S RI R 0\n1 0 0\n", "a.s1p", "a.s1p:1:13: 0 ohm is no reference resistance"),
    ("R minus", "# Hz S RI R -50\n1 0 0\n", "a.s1p", "a.s1p:1:13: -50 ohm is no reference"),
    ("R per port", "# Hz S RI R 50 75\n", "a.s2p", "a.s2p:1:16: '75' means nothing"),
    ("no data", "! only a comment\n# Hz S RI R 50\n", "a.s1p", "a.s1p:3:1: holds no data"),
    ("empty", "", "a.s1p", "a.s1p:1:1: holds no data"),
    ("no option", "1 0 0\n# Hz S RI R 50\n", "a.s1p", "a.s1p:1:1: has data before any option line"),
    ("word", "# Hz S RI R 50\n1 0 zero\n", "a.s1p", "a.s1p:2:5: 'zero' is not a number"),
    ("page", "<html>\n<body>no</body>", "a.s1p", "a.s1p:1:1: '<html>' is not a number"),
    ("underscore", "# Hz S RI R 50\n1_0 0 0\n", "a.s1p", "a.s1p:2:1: '1_0' is not a number"),
    ("comma", "# Hz S RI R 50\n1 0,5 0\n", "a.s1p", "a.s1p:2:3: '0,5' is not a number"),
    ("digits", "# Hz S RI R 50\n１ 0 0\n", "a.s1p", "a.s1p:2:1: '１' is not a number"),
    ("too many", f"# Hz S RI R 50\n{ROW}\n", "a.s1p", "a.s1p:2:1: has 9 numbers where 3 make one frequency"),
    ("four ports", "# Hz S RI R 50\n1 0 0 0 0 0 0 0 0\n0 0\n", "a.s4p", "a.s4p: is not named .s1p or .s2p"),
    ("suffix", "# Hz S RI R 50\n1 0 0\n", "a.txt", "a.txt: is not named .s1p or .s2p"),
]  # fmt: skip


@pytest.mark.parametrize(
    ("text", "name", "words"), [c[1:] for c in COMPLAINTS], ids=[c[0] for c in COMPLAINTS]
)
def test_every_complaint_has_its_place(text: str, name: str, words: str) -> None:
    """File, line and column as an editor counts them, and the value found."""
    assert refused(text, name).startswith(words)


@pytest.mark.parametrize(
    ("text", "advice"),
    [
        ("# Hz S RI R 50\n1 0 0 0\n", "The file is cut off."),
        ("# Hz Y RI R 50\n", "Convert it to S-parameters first."),
        ("1 0 0 0 0 0 0 0 0\n", 'A line such as "# Hz S RI R 50" comes first.'),
        ("# Hz S RI R 50\n1 nan 0\n", "The reading failed there; read it again."),
        ("hello", "Is this a Touchstone file?"),
    ],
)
def test_a_complaint_says_what_to_do(text: str, advice: str) -> None:
    assert refused(text).endswith(advice)


@pytest.mark.parametrize("data", [b"\xff\xfe#\x00", b"# Hz S RI R 50\n1 0 \xe9\n", b"\x89PNG\r\n\x1a\n\x00"])
def test_what_is_not_text_is_refused(data: bytes) -> None:
    assert "is not text: byte" in refused(data)


@pytest.mark.parametrize("rows", [1, 7])
def test_a_one_port_goes_round_bit_for_bit(rows: int) -> None:
    """Every double, the smallest and the signs of zero among them, comes back as it was."""
    generator = np.random.default_rng(1)
    f_hz = np.sort(generator.uniform(1, 1e11, rows))
    s = np.empty(rows, complex)
    s.real, s.imag = generator.standard_normal((2, rows)) * 10.0 ** generator.integers(-300, 3, (2, rows))
    s[0] = complex(-0.0, -0.0)
    back = read(write(f_hz, s, "made up\ntwo lines", 75.0), "a.s1p")
    assert back.f_hz.tobytes() == f_hz.tobytes()
    assert back.s[:, 0, 0].tobytes() == s.tobytes()
    assert back.z0_ohm == 75.0


@pytest.mark.parametrize("seed", range(5))
def test_a_two_port_goes_round_bit_for_bit(seed: int, random_device) -> None:
    device = random_device(seed, 201)
    f_hz = np.geomspace(5e6, 1.2e9, 201)
    data = write(f_hz, device)
    back = read(data, "a.s2p")
    assert back.f_hz.tobytes() == f_hz.tobytes()
    assert all(a.tobytes() == b.tobytes() for a, b in zip(back.two_port.planes, device.planes, strict=True))
    assert write(back.f_hz, back.two_port) == data


def test_what_is_written_is_read_by_scikit_rf(tmp_path, random_device) -> None:
    """Other people's reader finds the same numbers."""
    import skrf

    path, device, f_hz = tmp_path / "a.s2p", random_device(3), np.linspace(1e9, 2e9, 11)
    path.write_bytes(write(f_hz, device, "c"))
    network = skrf.Network(path)
    assert_allclose(network.s, device.matrix, rtol=1e-15)
    assert_allclose(network.f, f_hz, rtol=1e-15)


def test_a_comment_cannot_break_out_of_its_line() -> None:
    text = write(np.array([1.0]), np.array([0j]), "one\n# GHz S MA R 1\r2 2 2").decode()
    assert all(line.startswith("! ") for line in text.splitlines()[:3])
    assert one_port(text)[0] == 0


def test_an_instruments_raw_dump_is_refused_at_its_first_word() -> None:
    """A transfer saved with its frame is no Touchstone file."""
    assert refused("BEGIN\n#48066!maker\n# Hz S DB R 50\n1 0 0\n", "a.s1p").startswith("a.s1p:1:1: 'BEGIN'")


def test_the_planes_of_a_two_port_are_its_own() -> None:
    data = read(f"# MHz S RI R 50\n{ROW}\n".encode(), "a.s2p")
    assert isinstance(data.two_port, TwoPort)
