"""Bench files: the one that is shipped, and ones with mistakes."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from sim_instruments.bench import BadBench, load_bench
from sim_instruments.parts.measured import read_file
from sim_instruments.world import NoSuchItem

GOOD = """\
items:
  short: {kind: standard, standard: short}
units:
  pad:
    serial: "PD-[0-9]{4}"
    design: {kind: pad, loss: 10 dB}
    known: {PD-0001: {says: good}, PD-9001: {says: bad, loss: 12 dB}}
instruments:
  GPIB0::16::INSTR:
    kind: network analyzer
    receivers:
      {directivity: 28 dB, source match: 22 dB, load match: 24 dB, isolation: 116 dB, tracking: 0.6 dB,
       cable: {delay: 4.9 ns, loss: 0.9 dB}, noise: -152 dBm, trace noise: 0.0015 dB}
"""


def _load(folder: Path, text: str) -> None:
    path = folder / "bench.yaml"
    path.write_text(text, encoding="utf-8")
    load_bench(str(path), 1)


def test_a_small_bench_loads(tmp_path: Path) -> None:
    """Known units by their serial, with what is said of them."""
    path = tmp_path / "small.yaml"
    path.write_text(GOOD, encoding="utf-8")
    bench = load_bench(str(path), 1)
    assert bench.serials == {"PD-0001": "good", "PD-9001": "bad"}
    bench.world.offer("PD-9001")
    assert -20 * np.log10(abs(bench.world.truth(np.array([1e6]))[0, 1, 0])) == pytest.approx(12)


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ("kind: standard", "kind: gadget", "item 'short': there is no part of kind 'gadget'"),
        ("standard: short", "standard: shorted", "item 'short': there is no standard 'shorted'"),
        (", standard: short", "", "item 'short': 'standard' is missing"),
        ("standard: short", "standard: short, dealy: 3 ps", "item 'short': does not know 'dealy'"),
        ("network analyzer", "kettle", "instrument 'GPIB0::16::INSTR': there is no instrument of kind"),
        ("directivity: 28 dB, ", "", "instrument 'GPIB0::16::INSTR': 'directivity' is missing"),
        ("noise: -152 dBm", "noise: quiet", "'quiet' is no value with a unit"),
        ("instruments:", "instrument:", "'instruments' is missing"),
        ("items:", "items: [", "bench.yaml"),
        (GOOD, "- 1", "is no list of names with values"),
        ('"PD-[0-9]{4}"', '"PD-["', "unit family 'pad': serial 'PD-\\[' is no pattern"),
    ],
)
def test_mistakes_are_said_in_a_sentence(tmp_path: Path, old: str, new: str, says: str) -> None:
    """File, where, and what is wrong."""
    with pytest.raises(BadBench, match=says) as caught:
        _load(tmp_path, GOOD.replace(old, new))
    assert str(tmp_path / "bench.yaml") in str(caught.value)


def test_an_unknown_bench_names_the_known() -> None:
    """A name that is no file."""
    with pytest.raises(BadBench, match=r"no simulated bench 'workshed' .*known are .*workshop"):
        load_bench("workshed", 1)


def test_an_unknown_unit_names_the_known() -> None:
    """A serial of no family."""
    with pytest.raises(NoSuchItem, match="no unit 'XX-1'; it has HF-0001"):
        load_bench("workshop", 1).world.offer("XX-1")


def test_every_known_unit_can_be_offered() -> None:
    """Each known serial is a part of one or two ports that answers on any grid."""
    bench, f = load_bench("workshop", 3), np.linspace(100e6, 300e6, 21)
    for serial in bench.serials:
        bench.world.offer(serial)
        truth = bench.world.truth(f)
        assert truth.shape in ((21, 1, 1), (21, 2, 2)), serial
        assert np.all(np.isfinite(truth)), serial


@pytest.mark.parametrize("half", ["jig-left", "jig-right"])
def test_fixture_files_are_the_nominal_jig(half: str) -> None:
    """The de-embedding files equal the jig of the bench file, without its spread."""
    file = Path(__file__).parents[3] / "sequences/fixtures" / f"{half}.s2p"
    f, s = read_file(file)
    np.testing.assert_allclose(load_bench("workshop", 1).fixtures[half].matrix(f), s, rtol=0, atol=1e-12)
