"""``benchrun match``: every choice from a record, a file or an impedance; what cannot be matched is said."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.report.match import drawing
from benchrun.rf.design import SERIES
from benchrun.rf.design.choices import Wish, choices
from benchrun.rf.design.ladder import Ladder
from benchrun.rf.design.parts import Branch, Line, Part, Stub
from benchrun.rf.touchstone import write
from benchrun.rf.twoport import TwoPort

F = np.linspace(100e6, 300e6, 401)


@pytest.fixture
def antenna(tmp_path):
    """A resistance of 18 ohm with a capacitor of 26.8 pF in series: 18 - 35j ohm at 169.7 MHz."""
    z = 18.0 + 1.0 / (2j * np.pi * F * 26.8e-12)
    (tmp_path / "antenna.s1p").write_bytes(write(F, (z - 50.0) / (z + 50.0)))
    return tmp_path / "antenna.s1p"


def test_every_choice_is_of_parts_that_can_be_bought(cli, antenna):
    answer = cli("match", str(antenna), "--at", "169.4 MHz", "--json", "--capacitors", "E12")
    assert answer.code == 0
    assert answer.err == ""
    found = answer.document
    assert found["load_ohm"] == pytest.approx([18.0, -35.06], abs=0.01)
    kinds = [one["kind"] for one in found["choices"]]
    assert {kind: kinds.count(kind) for kind in set(kinds)} == {"L": 4, "pi": 4, "tee": 4, "stub": 8}
    for one in found["choices"]:
        for part in one["elements"]:
            if part["part"] in ("coil", "capacitor"):
                series = "E24" if part["part"] == "coil" else "E12"
                mantissa = float(f"{part['value']:.6e}".split("e")[0])
                assert min(abs(mantissa - v) for v in SERIES[series]) < 1e-9
                assert part["tolerance"] == {"E24": 0.05, "E12": 0.1}[series]
        assert 0 <= one["yield"] <= 1
        assert one["loss_db"] >= 0
    assert found["choices"][0]["yield"] == max(one["yield"] for one in found["choices"])


def test_what_is_told_of_a_choice_follows_from_its_parts():
    z = 18.0 + 1.0 / (2j * np.pi * F * 26.8e-12)
    for one in choices(F, z, Wish(169.4e6, vswr=1.5)):
        # The network and the load by ABCD, written out here: what the source sees in its band and beyond.
        for f_hz in (169.4e6, one.low_hz, one.high_hz):
            if not np.isfinite(f_hz):
                continue
            seen, f = 18.0 + 1.0 / (2j * np.pi * f_hz * 26.8e-12), np.array([f_hz])
            for element in reversed(one.ladder.elements):
                a, b, c, d = (complex(x[0]) for x in element.chain(f, np.ones(len(element.varying))))
                seen = (a * seen + b) / (c * seen + d)
            size = abs((seen - 50.0) / (seen + 50.0))
            vswr = (1 + size) / (1 - size)
            assert vswr == pytest.approx(one.vswr if f_hz == 169.4e6 else 1.5, rel=3e-3)


def test_the_screen_draws_each_choice(cli, antenna):
    answer = cli("match", str(antenna), "--at", "169.4 MHz", "--vswr", "2")
    assert answer.code == 0
    assert answer.out.startswith("18 - 35.06j ohm at 169.4 MHz, 20 ways to match it")
    assert "band, VSWR 2" in answer.out
    assert answer.out.count("50 ohm --") == 20
    assert all(len(line) <= 120 for line in answer.out.splitlines())


def test_a_drawing_shows_what_stands_where():
    elements = (
        Branch("shunt", (Part("capacitor", 12e-12),)),
        Branch("series", (Part("coil", 33e-9),)),
        Stub("shunt", "short", Line(50.0, 0.125, 1e8)),
        Line(50.0, 0.25, 1e8),
    )
    top, middle, bottom = drawing(elements, "50 ohm", "load")
    assert top.startswith("50 ohm --")
    assert top.endswith(" load")
    joints = [i for i, sign in enumerate(top) if sign == "+"]
    assert len(joints) == 2
    assert middle.index("[12 pF]") <= joints[0] < middle.index("[12 pF]") + 7
    assert middle.index("[short stub") <= joints[1] <= middle.index("wavelengths]")
    assert [i for i, sign in enumerate(bottom) if sign == "|"] == joints[:1], "a stub ends in itself"
    assert top.index("[33 nH]") < joints[1] < top.index("[line 0.250 wavelengths]")


def test_an_impedance_from_a_record(cli, tmp_path):
    assert cli("rehearse", "whip-antenna", "--unit", "WA-9001", "--seed", "1").code == 1
    (record,) = (path for path in (tmp_path / "records").iterdir() if path.is_dir())
    answer = cli("match", str(record), "--at", "169.4 MHz", "--json")
    assert answer.code == 0
    assert len(answer.document["choices"]) >= 12


def test_a_given_impedance(cli):
    answer = cli("match", "--load", "25 ohm", "--at", "1 GHz", "--json")
    ideal = next(one for one in answer.document["choices"] if one["name"] == "shunt capacitor, series coil")
    # facts: 3.18 pF and 3.98 nH for 25 ohm at 1 GHz; 3.3 pF and 3.9 nH can be bought.
    assert [part["value"] for part in ideal["elements"]] == pytest.approx([3.3e-12, 3.9e-9])


@pytest.mark.parametrize(
    ("arguments", "expected"),
    [
        (("--at", "169.4 MHz"), "name a record or file, or give an impedance"),
        (("--load", "18 ohm"), "Missing option '--at'"),
        (("--load", "18 ohm", "--at", "169.4"), "has no unit"),
        (("--load", "0 + 5j ohm", "--at", "1 GHz"), "its resistance must be above 0 ohm"),
        (("--load", "1e ohm", "--at", "1 GHz"), "1e ohm"),
        (("--load", "18 ohm", "--at", "1 GHz", "--vswr", "1"), "a VSWR of 1 bounds no band"),
        (("--load", "18 ohm", "--at", "1 GHz", "--q", "0.1"), "a Q of 0.1 cannot be had"),
        (("antenna.s1p", "--at", "1 GHz"), "1000 MHz lies outside what is known of the load"),
        (("antenna.s1p", "--at", "169 MHz", "--port", "2"), "has one port, so there is no port 2"),
        (("active.s2p", "--at", "169 MHz"), "reflects 1.2 times what it gets at 100 MHz"),
        (("nowhere.s1p", "--at", "169 MHz"), "nowhere.s1p"),
        (("filter.yaml", "--at", "169 MHz"), "filter.yaml"),
        ((".", "--at", "169 MHz"), ""),
    ],
)
def test_what_cannot_be_matched_is_said_in_a_sentence(cli, antenna, tmp_path, arguments, expected):
    one = np.ones(len(F)) + 0j
    (tmp_path / "active.s2p").write_bytes(write(F, TwoPort(1.2 * one, one, one, one)))
    answer = cli("match", *arguments)
    assert answer.code in (2, 5)
    assert expected in answer.err
    assert "Traceback" not in answer.err


def test_a_ladder_without_stubs_or_lines_is_a_wire():
    assert drawing(Ladder("a wire", ()).elements, "50 ohm", "load") == ("50 ohm ---- load", "", "")
