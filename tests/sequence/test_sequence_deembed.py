"""What a step ``de-embed`` may say, and what its files must be."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.errors import InputError
from benchrun.rf.touchstone import read, write
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.fixtures import check_fixtures
from benchrun.sequence.steps.deembed import DeEmbed

STEP = "de-embed: {as: filter, from: raw, left: left.s2p}"


def text_of(good, step):
    return good.replace(STEP, f"de-embed: {{as: filter, from: raw, {step}}}")


@pytest.mark.parametrize(
    ("step", "words", "files"),
    [
        ("left: a, right: b", "a and b out of raw", ["a", "b"]),
        ("right: b, embed: true", "b around raw", ["b"]),
        ("2x-thru: {file: t, class: B}", "halves of t out of raw", ["t"]),
        ("dummies: {open: o, short: s, first: short}", "dummies o and s out of raw", ["o", "s"]),
        ("adapter: {port: 2, file: x}", "adapter x out of port 2's calibration", ["x"]),
        (
            "adapter: {port: 1, without: plane, behind: plane, delay: 90 ps}",
            "adapter between plane and plane out of port 1's calibration",
            [],
        ),
        ("shift: {1: {delay: 120 ps, loss: 0.1 dB}}", "planes moved, port 1 by 120 ps", []),
        ("renormalise: 75 ohm", "to 75 ohm", []),
        ("renormalise: [73 + 42.5j ohm, 50 ohm], waves: pseudo", "to 73 + 42.5j ohm and 50 ohm", []),
    ],
)
def test_each_way_is_read_and_told(load_text, good, step, words, files):
    (found,) = (s for s in load_text(text_of(good, step)).model.steps if isinstance(s, DeEmbed))
    assert found.text == words
    assert list(found.files().values()) == files


@pytest.mark.parametrize(
    ("step", "expected"),
    [
        ("left: a, shift: {1: {delay: 1 ps}}", "does 2 things (left, shift)"),
        ("shift: {1: {delay: 1 ps}}, embed: true", "`embed` puts `left` and `right` around"),
        ("dummies: {}", "names no dummy"),
        ("dummies: {thru: t, open: o}", "`thru` is split in two halves and stands alone"),
        ("adapter: {port: 1}", "needs a `file`, or two calibrations"),
        ("adapter: {port: 1, file: x, delay: 1 ps}", "names a `file` and calibrations"),
        ("adapter: {port: 3, file: x}", "port: 3 is not allowed here"),
        ("shift: {3: {delay: 1 ps}}", "the key 3 is not allowed here"),
        ("shift: {1: {delay: 120}}", "has no unit"),
        ("renormalise: 75", "75 has no unit"),
        ("renormalise: -75 ohm", "its resistance must be above 0 ohm"),
        ("renormalise: 0 + 50j ohm", "its resistance must be above 0 ohm"),
        ("renormalise: [50 ohm]", "names 1 impedances"),
        ("left: a, waves: power", "`waves` belongs to `renormalise`"),
        ("2x-thru: {file: t, class: D}", "class: 'D' is not allowed here"),
        ("adapter: {port: 1, without: a, behind: plane, delay: 9 ps}", None),
    ],
)
def test_what_makes_no_sense_is_refused_at_its_place(load_text, good, step, expected):
    from benchrun.sequence.checks import check_sequence

    try:
        problems = check_sequence(load_text(text_of(good, step)))
    except InputError as error:
        problems = list(error.problems)
    said = [str(problem) for problem in problems]
    assert len(said) == 1, said
    assert (expected or "names no calibration that stands before this step") in said[0]
    assert said[0].startswith("f.yaml:13:")


F = np.linspace(5e6, 1.2e9, 801)


def data(s21=0.9 + 0j, s11=0.05, z0=50.0):
    plane = np.full(len(F), s21, np.complex128)
    return read(write(F, TwoPort(plane * 0 + s11, plane, plane, plane * 0 + s11), "", z0), "x.s2p")


@pytest.mark.parametrize(
    ("step", "file", "expected"),
    [
        ("left: x", data(), ""),
        ("left: x", data(1.2), "x shows a gain"),
        # Each parameter alone is below one, both together are not passive.
        ("left: x", data(0.9, 0.3), "x shows a gain"),
        ("left: x", data(z0=75.0), "x is given for 75 ohm, but the result it is taken out of for 50 ohm"),
        ("left: x", data(1e-4), "x lets next to nothing through"),
        ("dummies: {open: x}", data(1e-4), ""),
        ("2x-thru: {file: x}", data(1e-4), "x lets next to nothing through"),
    ],
)
def test_files_are_checked_against_what_they_are_taken_out_of(load_text, good, step, file, expected):
    found = check_fixtures(load_text(text_of(good, step)), {"x": file}, 50.0)
    assert [expected in str(problem) for problem in found] == ([True] if expected else [])


@pytest.mark.parametrize(
    ("first", "second", "expected"),
    [
        (
            "renormalise: 75 ohm",
            "left: x",
            "x is given for 50 ohm, but the result it is taken out of for 75 ohm",
        ),
        (
            "renormalise: [50 ohm, 75 ohm]",
            "shift: {1: {delay: 1 ps}}",
            "planes are moved in one real impedance",
        ),
        ("renormalise: 50 + 5j ohm", "renormalise: 50 ohm", ""),
    ],
)
def test_planes_are_moved_in_one_real_impedance(load_text, good, first, second, expected):
    both = f"{first}}}\n  - de-embed: {{as: again, from: filter, {second}"
    found = check_fixtures(load_text(text_of(good, both)), {"x": data()}, 50.0)
    assert [expected in str(problem) for problem in found] == ([True] if expected else [])


def test_an_impedance_is_told_from_waves_in_a_real_one(load_text, good):
    text = text_of(good, "renormalise: [50 + 5j ohm, 75 ohm]").replace(
        "limits:\n", "limits:\n        - {figure: resistance, port: 1, at: 10 MHz, at least: 1 ohm}\n"
        "        - {figure: resistance, port: 2, at: 10 MHz, at least: 1 ohm}\n"
    )  # fmt: skip
    (found,) = check_fixtures(load_text(text), {}, 50.0)
    assert "filter is given for 50 + 5j ohm" in str(found)


@pytest.mark.parametrize("step", ["right: x", "2x-thru: {file: x}", "dummies: {open: x}"])
def test_a_one_port_has_no_other_side(load_text, good, step):
    text = text_of(good, step).replace("unit:\n", "unit:\n  ports: 1\n").replace("SOLT", "SOL")
    found = check_fixtures(load_text(text), {"x": data()}, 50.0)
    assert ["needs two ports, but the unit has one" in str(problem) for problem in found] == [True]
