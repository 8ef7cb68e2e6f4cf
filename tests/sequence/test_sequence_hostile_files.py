"""Files made to hurt: size, depth, repetition, noise. Each ends in bounded time with a place."""

from __future__ import annotations

import time
from collections.abc import Iterator

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from benchrun.errors import InputError
from benchrun.paths import installed_sequences
from benchrun.sequence.checks import check_sequence
from benchrun.sequence.files import KINDS, load_model, read
from benchrun.sequence.loading import MAX_BYTES, load, read_bytes

BOMB = "a: &a [x, x, x, x, x, x, x, x, x]\n" + "".join(
    f"{n}: &{n} [{', '.join([f'*{m}'] * 9)}]\n" for m, n in zip("abcdefgh", "bcdefghi", strict=True)
)

HOSTILE = {
    "alias bomb": (BOMB, "uses an anchor or alias"),
    "merge key": ("sequence: x\n<<: *base\n", "uses an anchor or alias"),
    "flow depth": ("[" * 100_000, "nest"),
    "mapping depth": ("{a: " * 100_000, "nested more than 40 deep"),
    "keys of keys": ("{" * 100_000, "nest"),
    "block depth": ("".join(" " * i + "a:\n" for i in range(1000)), "nested more than 40 deep"),
    "indicator depth": ("- " * 100_000, "nested more than 40 deep"),
    "question marks": ("? " * 100_000, "as a key"),
    "many keys": ("sequence: x\n" + "".join(f"k{i}: 1\n" for i in range(60_000)), "more problems"),
    "many steps": ("sequence: x\nsteps:\n" + "- x\n" * 100_000, "lacks the key"),
    "a long word": ("sequence: " + "x" * 900_000, "sequence: 'xxx"),
    "a long key": ("? " + "x" * 900_000 + "\n: 1\n", "the key 'xxx"),
    "a long number": ("sequence: x\nedition: " + "9" * 900_000, "edition: '999"),
    "spaces": (" " * 900_000, "is empty"),
    "line ends": ("\n" * 900_000, "is empty"),
    "remarks": ("#" * 900_000, "is empty"),
    "tabs after content": ("sequence: x" + "\t" * 900_000, "lacks the key"),
    "quotes": ('"' * 900_001, "is not YAML here"),
    "colons": (": " * 300_000, "is not YAML here"),
}


@pytest.mark.slow
@pytest.mark.parametrize("name", HOSTILE)
def test_a_hostile_file_ends_in_bounded_time(problems, name):
    text, message = HOSTILE[name]
    assert len(text.encode()) <= MAX_BYTES
    before = time.perf_counter()
    found = problems(text)
    assert time.perf_counter() - before < 10.0
    assert len(found) <= 51
    assert any(message in str(p) for p in found), [str(p)[:200] for p in found][:3]
    assert all(p.line >= 1 and p.column >= 1 and len(str(p)) < 1000 for p in found)


def test_a_file_of_ten_megabytes_is_not_read(tmp_path):
    big = tmp_path / "big.yaml"
    big.write_bytes(b"sequence: x\n" + b"#" * 10_000_000)
    with pytest.raises(InputError, match=r"big\.yaml: is 10,000,012 bytes long, at most 1,000,000 are"):
        read(big, KINDS["sequence"])


def test_ten_megabytes_in_a_record_are_not_parsed():
    with pytest.raises(InputError, match="is 10,000,000 bytes long"):
        load(b"#" * 10_000_000, "copy.yaml")


def test_what_cannot_be_opened_is_told(tmp_path):
    with pytest.raises(InputError, match=r"none\.yaml: cannot be read: No such file"):
        read_bytes(tmp_path / "none.yaml")
    with pytest.raises(InputError, match="cannot be read"):
        read_bytes(tmp_path)


def _installed() -> Iterator[tuple[str, bytes]]:
    root = installed_sequences()
    for kind, folder in (("sequence", ""), ("bench", "benches"), ("kit", "kits"), ("mask", "masks")):
        for path in sorted((root / folder).glob("*.yaml")):
            yield kind, path.read_bytes()


GOOD_FILES = list(_installed())
PIECES = [
    b": ", b"- ", b"{", b"}", b"[", b"]", b"\n", b" ", b'"', b"'", b"#", b"&a ", b"*a", b"!", b"%",
    b"\t", b"\0", b"\xff", b"\xe2\x80\xa8", b"?", b"|", b">", b"---", b"~", b"1", b"-1e999", b".nan",
    b"0x1F", b"MHz", b"dB", b"to", b"true", b",", b"steps", b"sweep", b"judge", b"\\x00", b"\x85",
]  # fmt: skip


@st.composite
def mutations(draw: st.DrawFn) -> tuple[str, bytes]:
    kind, raw = draw(st.sampled_from(GOOD_FILES))
    data = bytearray(raw)
    for _ in range(draw(st.integers(1, 4))):
        i = draw(st.integers(0, len(data)))
        j = min(len(data), i + draw(st.integers(0, 12)))
        data[i:j] = draw(st.sampled_from(PIECES) | st.binary(max_size=4))
    return kind, bytes(data)


def _gives_a_model_or_places(kind: str, raw: bytes) -> None:
    try:
        loaded = load_model(raw, "f.yaml", KINDS[kind])
    except InputError as caught:
        found = list(caught.problems)
        assert found
    else:
        found = check_sequence(loaded) if kind == "sequence" else []
    assert all(p.line >= 1 and p.column >= 1 and p.message for p in found)


@settings(derandomize=True, max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(mutations())
def test_a_mutated_file_gives_a_model_or_places(mutation):
    _gives_a_model_or_places(*mutation)


_TEXT = st.text(max_size=200).map(lambda text: text.encode("utf-8", "surrogatepass"))


@settings(derandomize=True, max_examples=150, deadline=None)
@given(
    st.sampled_from(sorted(KINDS)),
    st.binary(max_size=200) | st.text(max_size=200).map(lambda t: t.encode("utf-8", "surrogatepass")),
)
def test_noise_gives_a_model_or_places(kind, raw):
    _gives_a_model_or_places(kind, raw)


_SCALARS = st.sampled_from(
    [None, True, 0, 1, -1, 10**20, 1e300, "", "x", "1 MHz", "wide", "plane", "S21", [], {}]
)


@settings(derandomize=True, max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.sampled_from(GOOD_FILES), st.data())
def test_any_value_anywhere_gives_a_model_or_places(good_file, data):
    import yaml

    kind, raw = good_file
    document = load(raw, "f.yaml")
    path = data.draw(st.sampled_from([p for p in document.places if p and p[-1] != "key"]))
    at = document.data
    for part in path[:-1]:
        at = at[part]
    at[path[-1]] = data.draw(
        _SCALARS | st.dictionaries(st.sampled_from(["as", "at", "x", "figure", "mask"]), _SCALARS)
    )
    text = yaml.safe_dump(document.data, allow_unicode=True)
    _gives_a_model_or_places(kind, text.encode())
