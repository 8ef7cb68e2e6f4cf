"""Touchstone version 2 through scikit-rf, and hostile bytes of either version.

Rules: IBIS Open Forum, Touchstone File Format Specification 2.0 (2009).
"""

from __future__ import annotations

import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.errors import InputError
from benchrun.rf.touchstone import TouchstoneData, read


def version_2(
    data: str = "1 .1 0 .21 0 .12 0 .22 0\n2 0 0 0 0 0 0 0 0",
    ports: str = "2",
    order: str = "[Two-Port Data Order] 21_12",
    count: str = "2",
    reference: str = "",
    option: str = "# GHz S RI R 50",
    extra: str = "",
) -> bytes:
    lines = [
        "[Version] 2.0", option, f"[Number of Ports] {ports}", order, f"[Number of Frequencies] {count}",
        reference, extra, "[Network Data]", data, "[End]",
    ]  # fmt: skip
    return "\n".join(line for line in lines if line).encode()


def refused(data: bytes, name: str = "a.ts") -> str:
    with pytest.raises(InputError) as caught:
        read(data, name)
    return str(caught.value)


@pytest.mark.parametrize(("order", "s21"), [("21_12", 0.21), ("12_21", 0.12)])
def test_the_order_of_a_two_port_is_the_one_it_states(order: str, s21: float) -> None:
    data = read(version_2(order=f"[Two-Port Data Order] {order}"), "a.ts")
    assert_allclose(data.two_port.s21[0], s21)
    assert_allclose(data.f_hz, [1e9, 2e9])


@pytest.mark.parametrize("name", ["a.ts", "a.s2p", "a.txt", "A.S1P", "no suffix"])
def test_version_2_states_its_ports_so_the_name_does_not_matter(name: str) -> None:
    assert read(version_2(), name).ports == 2


def test_a_reference_overrides_the_option_line() -> None:
    assert read(version_2(reference="[Reference] 75 75"), "a.ts").z0_ohm == 75.0


def test_a_one_port_of_version_2() -> None:
    data = read(version_2("1 .5 .25", "1", "", "1"), "a.ts")
    assert (data.ports, data.s[0, 0, 0]) == (1, 0.5 + 0.25j)


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (version_2(reference="[Reference] 50 25"), "a.ts: has its ports at [25. 50.] ohm"),
        (version_2(ports="4"), "a.ts: has '4' ports. One or two ports"),
        (version_2(ports="100000000"), "a.ts: has '100000000' ports"),
        (version_2(ports="two"), "a.ts: has 'two' ports"),
        (version_2(ports="0"), "a.ts: has '0' ports"),
        (version_2(extra="[Mixed-Mode Order] D1,2 C1,2"), "a.ts: holds mixed-mode parameters"),
        (
            version_2(data="1 nan 0 0 0 0 0 0 0\n2 0 0 0 0 0 0 0 0"),
            "a.ts: holds a value that is not a finite",
        ),
        (
            version_2(data="2 0 0 0 0 0 0 0 0\n1 0 0 0 0 0 0 0 0"),
            "a.ts: has frequencies that do not increase",
        ),
        (version_2(count="3"), "a.ts: "),
        (version_2(data="1 .1 0 .21 0 .12"), "a.ts: "),
        (version_2(data="1 one 0 .21 0 .12 0 0 0"), "a.ts: cannot be read as Touchstone 2"),
        (version_2(data=""), "a.ts: "),
        (version_2(data="", count="0"), "a.ts: holds no whole set of data. The file is cut off."),
        (version_2(extra="[Number of Ports] 1"), "a.ts: "),
        (
            b"[Version] 2.0\n# GHz S MA R 50\n[Number of Ports] 2\n",
            "a.ts: has no [Network Data]. The file is cut",
        ),
        (b"[Version] 2.0\n# GHz S MA R 50\n", "a.ts: has no [Number of Ports]"),
    ],
)
def test_what_is_not_one_or_two_plain_ports_is_refused(data: bytes, words: str) -> None:
    assert refused(data).startswith(words)


def test_a_lower_count_than_the_data_is_refused() -> None:
    """Never a part of a file without a word."""
    assert "[Number of Frequencies] says 1" in refused(version_2(count="1"))


alphabet = st.text(alphabet="0123456789.eE+-# \t\r\n!RSMADBHzGKIYnaif[]Versoi2", max_size=300)
PIECES = (
    "# Hz S RI R 50\n", "# GHz S DB R 50\n", "#\n", "1 0 0\n", "2 .5 .5 ", "\n", "! c\n", "nan ", "1e999 ",
    "[Version] 2.0\n", "[Number of Ports] 1\n", "[Number of Ports] 2\n", "[Number of Frequencies] 1\n",
    "[Two-Port Data Order] 21_12\n", "[Reference] 50\n", "[Network Data]\n", "[Noise Data]\n", "[End]\n",
    "[Matrix Format] Lower\n", "1 2 3 4 5 6 7 8 9\n", "-1 0 0\n", "1e400 1e400 1e400\n", "\x00", "[", "]",
    "[Begin Information]\n", "[End Information]\n", "[Mixed-Mode Order] S1 S2\n", "# Hz Z MA R 1e-320\n",
)  # fmt: skip
pieces = st.lists(st.sampled_from(PIECES), max_size=14).map("".join)


def judge(data: bytes, name: str) -> None:
    """Data that make sense, or one error; nothing else may come out."""
    try:
        found = read(data, name)
    except InputError as error:
        found = None
        text = str(error)
    if found is None:
        assert text.startswith(name)
        return
    assert isinstance(found, TouchstoneData)
    assert found.ports in (1, 2)
    assert found.s.shape == (len(found.f_hz), found.ports, found.ports)
    assert len(found.f_hz) > 0
    assert np.isfinite(found.f_hz).all()
    assert np.isfinite(found.s).all()
    assert np.all(np.diff(found.f_hz) > 0)
    assert found.z0_ohm > 0


@settings(deadline=None, max_examples=150)
@given(st.binary(max_size=300), st.sampled_from(["a.s1p", "a.s2p", "a.ts"]))
def test_any_bytes(data: bytes, name: str) -> None:
    judge(data, name)


@settings(deadline=None, max_examples=150)
@given(alphabet, st.sampled_from(["a.s1p", "a.s2p"]))
def test_any_text_of_the_right_letters(text: str, name: str) -> None:
    judge(text.encode(), name)


@settings(deadline=None, max_examples=150)
@given(pieces, st.sampled_from(["a.s1p", "a.s2p", "a.ts"]))
def test_any_order_of_the_right_pieces(text: str, name: str) -> None:
    judge(text.encode(), name)


@settings(deadline=None, max_examples=150)
@given(st.integers(0, 200), st.integers(0, 255))
def test_any_one_byte_changed_in_a_good_file(position: int, byte: int) -> None:
    for good, name in ((b"# Hz S RI R 50\n" + b"".join(b"%d .5 -.25\n" % k for k in range(1, 15)), "a.s1p"),
                       (version_2(), "a.ts")):  # fmt: skip
        changed = bytearray(good)
        changed[position % len(good)] = byte
        judge(bytes(changed), name)


@pytest.mark.parametrize(
    "data",
    [
        b"\n" * 100_000,
        b" " * 100_000,
        b"\t\n" * 50_000,
        b"! c\n" * 30_000,
        b"1" * 100_000,
        b"[" * 100_000,
        b"# " * 50_000,
        b"[Version] 2.0\n" + b"\n" * 100_000 + b"[Number of Ports] 2\n[Network Data]\n",
        b"[Version] 2.0\n[Number of Ports] " + b"9" * 100_000 + b"\n[Network Data]\n",
        b"# Hz S RI R " + b"5" * 100_000 + b"\n",
    ],
    ids=["lines", "spaces", "tabs", "comments", "digits", "brackets", "hashes", "v2", "v2 ports", "R"],
)
def test_hostile_bulk_ends_in_bounded_time(data: bytes) -> None:
    """A hundred kilobytes of anything: well under a second (quadratic work would take minutes)."""
    started = time.process_time()
    with pytest.raises(InputError):
        read(data, "a.s1p")
    assert time.process_time() - started < 2.0
