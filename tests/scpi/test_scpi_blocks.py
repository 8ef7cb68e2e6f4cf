"""Blocks of numbers: both byte orders, both widths, both framings, and everything that can be wrong."""

from __future__ import annotations

import struct

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchrun.errors import BenchError, DeadlineExceeded, FramingError, ReplyError
from benchrun.scpi.block import BLOCK_FORMS, decode, read_block

FORMS = sorted(BLOCK_FORMS)


def framed(payload: bytes) -> bytes:
    size = str(len(payload))
    return f"#{len(size)}{size}".encode() + payload + b"\n"


@pytest.mark.parametrize(
    ("form", "one"),
    [
        ("REAL,32 NORMal", "3f800000"),
        ("REAL,32 SWAPped", "0000803f"),
        ("REAL,64 NORMal", "3ff0000000000000"),
        ("REAL,64 SWAPped", "000000000000f03f"),
    ],
)
def test_one_is_written_so(form, one):
    """IEEE 754 words by FORMat:BORDer (SCPI-1999 Volume 2)."""
    assert decode(bytes.fromhex(one), form, 1, "", "").tolist() == [1.0]


@pytest.mark.parametrize("end", [True, False])
@pytest.mark.parametrize("form", FORMS)
def test_definite_blocks(fake, form, end):
    values = np.array([1.0, -2.5, 1e-3, 9.91e37]).astype(BLOCK_FORMS[form])
    session, _ = fake({"DATA?": framed(values.tobytes())}, end=end)
    np.testing.assert_array_equal(session.query_values("DATA?", form, 4), values.astype(float))


def test_single_precision_is_kept_exactly(fake):
    value = np.float32(0.1)
    session, _ = fake({"DATA?": framed(value.tobytes())})
    assert session.query_values("DATA?", "REAL,32 SWAPped", 1)[0] == float(value) != 0.1


def test_a_payload_full_of_lf_and_hashes_is_data(fake):
    payload = b"\n" * 40_000 + b"#3#3\n\n#0" * 5_000
    session, _ = fake({"DATA?": framed(payload)}, end=False)
    expected = np.frombuffer(payload, ">f8")
    np.testing.assert_array_equal(session.query_values("DATA?", "REAL,64 NORMal", 10_000), expected)


@pytest.mark.parametrize("end", [True, False])
def test_an_indefinite_block_of_known_count(fake, end):
    payload = np.frombuffer(b"\n" * 80, ">f8")
    session, _ = fake({"DATA?": b"#0" + payload.tobytes() + b"\n"}, end=end)
    np.testing.assert_array_equal(session.query_values("DATA?", "REAL,64 NORMal", 10), payload)


def test_an_indefinite_block_of_unknown_count_ends_with_end(fake):
    session, _ = fake({"DATA?": b"#0" + b"\n" * 24 + b"\n"}, end=True)
    assert len(session.query_values("DATA?", "REAL,64 NORMal")) == 3


def test_an_indefinite_block_of_unknown_count_cannot_end_on_a_bare_socket(fake):
    session, _ = fake({"DATA?": b"#0" + bytes(9)}, name="TCPIP::127.0.0.1::5::SOCKET", end=False)
    with pytest.raises(FramingError, match="unstated length"):
        session.query_values("DATA?", "REAL,64 NORMal")


def test_ascii_lists(fake):
    session, _ = fake({"DATA?": b"1.5,-2E-3, 3\n"})
    assert session.query_values("DATA?", "ASCii", 3).tolist() == [1.5, -0.002, 3.0]
    assert session.transcript.exchanges[-1].text.startswith("block of 12 bytes, SHA-256 ")


@pytest.mark.parametrize("reply", [b"\n", b"1,,2\n", b"1;2\n", b"1,\xb5\n"])
def test_ascii_lists_that_are_none(fake, reply):
    session, _ = fake({"DATA?": reply})
    with pytest.raises(ReplyError, match="numbers joined by commas"):
        session.query_values("DATA?", "ASCii")


@pytest.mark.parametrize(
    ("reply", "said"),
    [
        (b"-113,no\n", "'-113,no' where a data block"),
        (b"\n", "'' where a data block"),
        (b"#x12\n", "'#x12' where a data block"),
        (b"#2ab\n", "'#2ab' where a block length"),
        (b"#9999999999\n", "'#9999999999' where a block length up to 268,435,456"),
    ],
)
@pytest.mark.parametrize("end", [True, False])
def test_garbage_instead_of_a_block_is_shown(fake, reply, said, end):
    session, _ = fake({"DATA?": reply}, end=end)
    with pytest.raises(ReplyError) as caught:
        session.query_values("DATA?", "REAL,64 NORMal", 1)
    assert said in str(caught.value)


def test_too_few_bytes_with_end(fake):
    session, _ = fake({"DATA?": b"#216" + bytes(7)}, end=True)
    with pytest.raises(FramingError, match="ended its answer after 7 bytes where 17 were due"):
        session.query_values("DATA?", "REAL,64 NORMal", 2)


def test_too_few_bytes_without_end(fake):
    session, _ = fake({"DATA?": b"#216" + bytes(7)}, end=False)
    with pytest.raises(DeadlineExceeded):
        session.query_values("DATA?", "REAL,64 NORMal", 2)


def test_too_many_bytes(fake):
    session, resource = fake({"DATA?": b"#18" + bytes(9) + b"\n", "Q?": b"yes\n"}, end=False)
    with pytest.raises(FramingError, match=r"a block of 8 bytes, but the byte after it is b'\\x00'"):
        session.query_values("DATA?", "REAL,64 NORMal", 1)
    assert session.query("Q?") == "yes"
    assert resource.clears == 1


@pytest.mark.parametrize(("size", "said"), [(12, "12 bytes"), (24, "3 numbers")])
def test_a_block_of_another_count_is_refused_and_leaves_the_line_usable(fake, size, said):
    session, resource = fake({"DATA?": framed(bytes(size)), "Q?": b"yes\n"})
    with pytest.raises(ReplyError, match=said):
        session.query_values("DATA?", "REAL,64 NORMal", 2)
    assert session.query("Q?") == "yes"
    assert resource.clears == 0


@given(st.lists(st.floats(width=32, allow_nan=False), max_size=40), st.sampled_from(FORMS))
def test_any_numbers_come_back(values, form):
    order, width = BLOCK_FORMS[form][0], "d" if "64" in form else "f"
    payload = struct.pack(f"{order}{len(values)}{width}", *values)
    assert decode(payload, form, len(values), "", "").tolist() == values


@given(st.binary(max_size=60), st.sampled_from([*FORMS, "ASCii"]))
def test_any_bytes_give_numbers_or_our_error(data, form):
    place = [0]

    def take(size):
        place[0] += size
        return data[place[0] - size : place[0]]

    try:
        payload = read_block(take, lambda: data[place[0] :], lambda: b"", "R", "Q?")
        decode(payload, form, None, "R", "Q?")
    except BenchError as caught:
        said = str(caught)
    else:
        return
    assert said.startswith("R after 'Q?': ")
