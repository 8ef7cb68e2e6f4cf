"""SOL on measured data: an antenna, with standards whose offsets are known.

Data: shared/data/antenna_oneport. Standards from its README: 33 ps one way, 50 ohm, 2.3 Gohm/s each;
open without capacitance, short without inductance, match of 49.8 ohm behind the same line.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InputError
from benchrun.hookup import Hookup
from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.band import decibels
from benchrun.rf.figures.crossing import edge
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.touchstone import TouchstoneData, read

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "antenna_oneport"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")

LINE = Offset(33e-12, 2.3e9, 50.0)
KIT = Kit(
    "field analyzer's own",
    {
        "short": Standard("short", LINE),
        "open": Standard("open", LINE),
        "load": Standard("load", LINE, resistance_ohm=49.8),
    },
)
FILES = {"short": "raw_short.s1p", "open": "raw_open.s1p", "load": "raw_match.s1p"}
SOL = METHODS["SOL"]


def load(name: str) -> TouchstoneData:
    return read((FOLDER / name).read_bytes(), name)


def plane(name: str) -> np.ndarray:
    return load(name).s[:, 0, 0]


@pytest.fixture(scope="module")
def f_hz() -> np.ndarray:
    return load("raw_antenna.s1p").f_hz


def solve(kit: Kit, f_hz) -> OnePortTerms:
    readings = {Hookup.of(n, 1).text: load(file).two_port for n, file in FILES.items()}
    solved = SOL.solve((1,), define(kit, SOL.standards, f_hz), readings)
    assert isinstance(solved, OnePortTerms)
    return solved


@pytest.fixture(scope="module")
def terms(f_hz) -> OnePortTerms:
    return solve(KIT, f_hz)


@pytest.fixture(scope="module")
def antenna(terms: OnePortTerms) -> np.ndarray:
    return terms.correct(plane("raw_antenna.s1p"))


@pytest.mark.parametrize("name", ["open", "short", "match"])
def test_the_standards_are_the_other_programs_standards(name: str, f_hz) -> None:
    """Our polynomial model and the source's own evaluation of it, to rounding."""
    ours = KIT.standards["load" if name == "match" else name].reflection(f_hz)
    with np.load(FOLDER / "ref_error_terms.npz") as reference:
        assert_allclose(ours, reference[f"std_{name}"], atol=1e-12)


def test_the_error_terms_are_reproduced(terms: OnePortTerms) -> None:
    with np.load(FOLDER / "ref_error_terms.npz") as reference:
        assert_allclose(terms.directivity, reference["e00"], atol=1e-12)
        assert_allclose(terms.source_match, reference["e11"], atol=1e-12)
        delta = terms.directivity * terms.source_match - terms.tracking
        assert_allclose(delta, reference["delta_e"], atol=1e-12)


@pytest.mark.parametrize("part", ["antenna", "load_room", "cable_open", "cable_short"])
def test_the_reference_results_are_reproduced(part: str, terms: OnePortTerms) -> None:
    assert_allclose(terms.correct(plane(f"raw_{part}.s1p")), plane(f"ref_{part}.s1p"), atol=1e-8)


def test_an_older_c_program_agrees(antenna) -> None:
    """An unrelated program corrected the same reading: 9e-8, the digits that it printed."""
    assert np.abs(antenna - plane("other_program_antenna.s1p")).max() < 1.5e-7


def test_scikit_rf_agrees(f_hz, antenna) -> None:
    readings = {Hookup.of(n, 1).text: load(file).two_port for n, file in FILES.items()}
    examiner = SOL.examiner(f_hz, (1,), KIT, readings)
    assert differ(antenna, examiner(load("raw_antenna.s1p").two_port)) < 1e-12


def test_the_load_is_not_50_ohm_and_it_shows(f_hz, antenna) -> None:
    """With 50.0 in place of 49.8 ohm the antenna moves by 2.67e-3."""
    other = KIT.with_standard("load", Standard("load", LINE, resistance_ohm=50.0))
    moved = solve(other, f_hz).correct(plane("raw_antenna.s1p"))
    assert_allclose(np.abs(moved - plane("other_program_antenna.s1p")).max(), 2.67e-3, rtol=2e-3)
    assert 2e-3 < np.abs(moved - antenna).max() < 3e-3


def test_the_offsets_matter(f_hz, antenna) -> None:
    """Ideal standards move the antenna by up to 0.0371."""
    ideal = Kit("ideal", {n: Standard(n) for n in FILES})
    moved = solve(ideal, f_hz).correct(plane("raw_antenna.s1p"))
    assert_allclose(np.abs(moved - antenna).max(), 0.0371, atol=6e-5)


@pytest.mark.parametrize(
    ("f_mhz", "db", "deg", "vswr", "z"),
    [
        (40.0, -0.609, 12.34, 28.537, 137.24 + 418.00j),
        (60.2667, -12.024, 163.35, 1.668, 30.38 + 4.65j),
        (75.2, -15.436, 37.00, 1.407, 64.04 + 13.42j),
        (99.7333, -13.267, -117.57, 1.555, 38.17 - 15.42j),
        (149.8667, -7.140, 110.80, 2.569, 26.80 + 27.29j),
        (200.0, -6.581, 58.11, 2.765, 53.85 + 54.94j),
    ],
)
def test_the_printed_antenna(f_hz, antenna, f_mhz: float, db: float, deg: float, vswr: float, z) -> None:
    """Level, angle, standing wave ratio and impedance, to the digits printed."""
    k = int(np.argmin(np.abs(f_hz - f_mhz * 1e6)))
    assert_allclose(decibels(antenna)[k], db, atol=6e-4)
    assert_allclose(np.degrees(np.angle(antenna[k])), deg, atol=6e-3)
    assert_allclose(50 * (1 + antenna[k]) / (1 - antenna[k]), z, atol=8e-3)
    found = FIGURES["VSWR"].measure(f_hz, antenna, "at most", over=None, at=float(f_hz[k]), port=1)
    assert_allclose(found.value, vswr, atol=6e-4)


def test_the_matched_band(f_hz, antenna) -> None:
    """-10 dB from 56.797 to 114.498 MHz, deepest -16.18 dB at 83.733 MHz."""
    return_loss = -decibels(antenna)
    deepest = FIGURES["return loss"].measure(f_hz, antenna, "at most", over=(40e6, 140e6), port=1)
    assert_allclose([deepest.value, deepest.at_hz], [16.18, 83.733e6], rtol=3e-4)
    drop = float(deepest.value) - 10.0
    low, high = edge(f_hz, return_loss, drop, False), edge(f_hz, return_loss, drop, True)
    assert_allclose(np.array([low, high]) / 1e6, [56.797, 114.498], atol=6e-4)


def test_a_load_of_the_room_is_a_load(terms: OnePortTerms) -> None:
    assert_allclose(decibels(terms.correct(plane("raw_load_room.s1p"))).max(), -48.87, atol=6e-3)


@pytest.mark.parametrize("path", sorted((FOLDER / "as_saved").glob("*.s1p")), ids=lambda p: p.name)
def test_files_as_the_link_wrote_them_are_refused(path: Path) -> None:
    """They start with a frame of the transfer: no valid Touchstone, and said so with its place."""
    with pytest.raises(InputError, match=f"{path.name}:1:1: 'BEGIN' is not a number"):
        read(path.read_bytes(), path.name)
