"""SOLT on measured data: a 20 dB attenuator behind two cables, whose direct reading is the truth.

Data: shared/data/attenuator_solt. Its standards are taken as ideal with a flush thru, as its README says.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.figures.band import decibels
from benchrun.rf.kit import Kit, Standard
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.touchstone import TouchstoneData, read
from benchrun.rf.twoport import TwoPort

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "attenuator_solt"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")

KIT = Kit("ideal", {n: Standard(n) for n in ("short", "open", "load", "thru")})
FILES = {"short": "raw_short", "open": "raw_open", "load": "raw_match"}
SOLT = METHODS["SOLT"]


def load(name: str) -> TouchstoneData:
    return read((FOLDER / name).read_bytes(), name)


@pytest.fixture(scope="module")
def readings() -> dict[str, TwoPort]:
    found = {
        f"{standard} on port {port}": load(f"{file}_port{port}.s2p").two_port
        for standard, file in FILES.items()
        for port in (1, 2)
    }
    return found | {"thru from port 1 to port 2": load("raw_thru.s2p").two_port}


@pytest.fixture(scope="module")
def f_hz() -> np.ndarray:
    return load("dut_raw.s2p").f_hz


@pytest.fixture(scope="module")
def terms(readings, f_hz) -> TwelveTerms:
    solved = SOLT.solve((1, 2), define(KIT, SOLT.standards, f_hz), readings)
    assert isinstance(solved, TwelveTerms)
    return solved


@pytest.fixture(scope="module")
def corrected(terms: TwelveTerms) -> TwoPort:
    return terms.correct(load("dut_raw.s2p").two_port)


def test_the_readings_share_one_grid(f_hz) -> None:
    """45 MHz to 20 GHz, 201 points, in every file."""
    assert (f_hz[0], f_hz[-1], len(f_hz)) == (45e6, 20e9, 201)
    for path in FOLDER.glob("*.s2p"):
        assert_allclose(load(path.name).f_hz, f_hz, err_msg=path.name)


def test_the_reference_result_is_reproduced(corrected: TwoPort) -> None:
    """Ten digits stand in the reference file; 1e-8 is what they can show."""
    assert_allclose(corrected.matrix, load("ref_dut_solt.s2p").s, atol=1e-8)


@pytest.mark.parametrize("way", ["forward", "reverse"])
@pytest.mark.parametrize(
    ("term", "key"),
    [
        ("directivity", "directivity"),
        ("source_match", "source_match"),
        ("tracking", "reflection_tracking"),
        ("load_match", "load_match"),
        ("transmission", "transmission_tracking"),
    ],
)
def test_the_reference_error_terms_are_reproduced(terms: TwelveTerms, way: str, term: str, key: str) -> None:
    with np.load(FOLDER / "ref_error_terms.npz") as reference:
        assert_allclose(getattr(getattr(terms, way), term), reference[f"{way}_{key}"], atol=1e-9)


def test_scikit_rf_agrees(readings, f_hz, corrected: TwoPort) -> None:
    """The run's own examination, on real data: within 1e-9."""
    examiner = SOLT.examiner(f_hz, (1, 2), KIT, readings)
    assert differ(corrected, examiner(load("dut_raw.s2p").two_port)) < 1e-9


def difference_db(one: TwoPort, f_hz, top_hz: float) -> np.ndarray:
    truth = load("direct_reading_1.s2p").two_port
    band = (f_hz >= 100e6) & (f_hz <= top_hz)
    return np.abs(decibels(one.s21) - decibels(truth.s21))[band]


def test_the_cables_are_gone(corrected: TwoPort, f_hz) -> None:
    """From 0.1 to 5 GHz the attenuator reads as it does without cables, to 0.35 dB; raw it is 3.6 dB off."""
    assert difference_db(corrected, f_hz, 5e9).max() < 0.35
    assert difference_db(load("dut_raw.s2p").two_port, f_hz, 5e9).max() > 3.5


@pytest.mark.parametrize(("top_ghz", "greatest"), [(1, 0.297), (3, 0.311), (5, 0.311)])
def test_the_printed_agreement(corrected: TwoPort, f_hz, top_ghz: float, greatest: float) -> None:
    assert_allclose(difference_db(corrected, f_hz, top_ghz * 1e9).max(), greatest, atol=1e-3)


@pytest.mark.parametrize(
    ("f_ghz", "s21_db", "s21_deg", "s11_db"),
    [
        (0.144775, -20.153, -2.02, -34.999),
        (1.04275, -20.265, -7.57, -30.497),
        (2.0405, -20.244, -14.76, -24.292),
        (5.03375, -20.081, -33.47, -26.416),
    ],
)
def test_the_printed_figures(corrected: TwoPort, f_hz, f_ghz, s21_db, s21_deg, s11_db) -> None:
    k = int(np.argmin(np.abs(f_hz - f_ghz * 1e9)))
    assert_allclose(decibels(corrected.s21)[k], s21_db, atol=6e-4)
    assert_allclose(decibels(corrected.s11)[k], s11_db, atol=6e-4)
    assert_allclose(np.degrees(np.angle(corrected.s21[k])), s21_deg, atol=6e-3)


def test_the_thru_corrected_by_its_own_calibration_is_a_thru(terms: TwelveTerms, readings) -> None:
    """Solving is exact: the standards come back as what they were taken for."""
    thru = terms.correct(readings["thru from port 1 to port 2"])
    assert_allclose(thru.matrix, TwoPort.through(201).matrix, atol=1e-12)


def test_ideal_standards_show_their_limit_above_18_ghz(corrected: TwoPort, f_hz) -> None:
    """A passive part that reflects more than it gets: what a look at passivity has to catch."""
    high = f_hz > 15e9
    assert np.abs(corrected.s11)[high].max() > 1.0 or np.abs(corrected.s22)[high].max() > 1.0
    assert np.abs(corrected.s11)[f_hz < 5e9].max() < 0.2
