"""Figures of a measured cavity band-pass filter, against what the data set's README expects.

Data: shared/data/filter_bandpass, read as the analyzer saved it (only S11 and S21 are readings).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.band import decibels
from benchrun.rf.masks import MaskLine
from benchrun.rf.touchstone import TouchstoneData, read

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "filter_bandpass"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")


@pytest.fixture(scope="module")
def data() -> TouchstoneData:
    name = "bandpass_915.s2p"
    return read((FOLDER / name).read_bytes(), name)


def figure(data: TouchstoneData, name: str, side: str = "at least", **parameters) -> float:
    return float(FIGURES[name].measure(data.f_hz, data.two_port, side, **parameters).value)


def test_the_file_is_read_whole(data: TouchstoneData) -> None:
    """1601 points of 37.5 kHz, tabs, three-digit exponents, dB and degrees; -200 dB placeholders."""
    assert data.f_hz.shape == (1601,)
    assert_allclose(np.diff(data.f_hz), 37.5e3)
    assert data.z0_ohm == 50.0
    assert_allclose(decibels(data.two_port.s12), -200.0)
    with np.load(FOLDER / "ref_figures.npz") as reference:
        assert_allclose(data.f_hz, reference["f_hz"])
        assert_allclose(decibels(data.two_port.s21), reference["s21_db"], atol=1e-9)
        assert_allclose(decibels(data.two_port.s11), reference["s11_db"], atol=1e-9)


@pytest.mark.parametrize(
    ("drop", "key", "printed"),
    [
        (1.0, "band1_mhz", (913.210, 915.495, 2.285)),
        (3.0, "band3_mhz", (913.046, 915.694, 2.648)),
        (20.0, "band20_mhz", (912.424, 916.378, 3.955)),
        (30.0, "band30_mhz", (912.180, 916.598, 4.418)),
    ],
)
def test_the_band_edges(data: TouchstoneData, drop: float, key: str, printed) -> None:
    """Relative to the peak, linear in dB: to the printed kilohertz and to the digits of the file."""
    low = figure(data, "corner frequency", drop=drop, edge="lower", trace="S21")
    high = figure(data, "corner frequency", drop=drop, edge="upper", trace="S21")
    width = figure(data, "bandwidth", drop=drop, trace="S21")
    found = np.array([low, high, width]) / 1e6
    assert_allclose(found, printed, atol=6e-4)
    with np.load(FOLDER / "ref_figures.npz") as reference:
        assert_allclose(found, reference[key], rtol=1e-9)
    assert_allclose(figure(data, "centre frequency", drop=drop, trace="S21"), (low + high) / 2)


def test_the_peak(data: TouchstoneData) -> None:
    found = FIGURES["gain"].measure(data.f_hz, data.two_port, "at most", over=(900e6, 960e6), trace="S21")
    assert_allclose(found.value, -13.685, atol=5e-4)
    assert_allclose(found.at_hz, 915.0375e6)


@pytest.mark.parametrize(
    ("f_mhz", "db"),
    [
        (901, -58.35),
        (910, -43.41),
        (914, -14.05),
        (915, -13.691),
        (916, -22.98),
        (920, -44.04),
        (959, -74.25),
    ],
)
def test_levels_along_the_skirts(data: TouchstoneData, f_mhz: float, db: float) -> None:
    """The README names the nearest sample; the grid does not hold every whole megahertz."""
    nearest = float(data.f_hz[np.argmin(np.abs(data.f_hz - f_mhz * 1e6))])
    assert_allclose(figure(data, "gain", at=nearest, trace="S21"), db, atol=6e-3)


def test_group_delay_at_the_peak(data: TouchstoneData) -> None:
    """328.2 ns between the neighbours of the peak: an aperture of two steps."""
    found = figure(data, "group delay", at=915.0375e6, aperture=75e3, trace="S21")
    with np.load(FOLDER / "ref_figures.npz") as reference:
        assert_allclose(found * 1e9, float(reference["group_delay_ns"]), rtol=1e-6)
    assert_allclose(found, 328.2e-9, rtol=1e-3)


def test_return_loss(data: TouchstoneData) -> None:
    """Best -18.24 dB at 908.85 MHz; -17.99 dB at the peak of S21."""
    best = FIGURES["return loss"].measure(data.f_hz, data.two_port, "at most", over=(900e6, 960e6), port=1)
    assert_allclose([best.value, best.at_hz], [18.24, 908.85e6], rtol=3e-4)
    assert_allclose(figure(data, "return loss", at=915.0375e6, port=1), 17.99, atol=6e-3)


def test_the_handy_limit_set_that_passes(data: TouchstoneData) -> None:
    """Above -15 dB in the pass band, below -40 dB outside with -49.55 dB the worst there."""
    assert figure(data, "gain", "at least", over=(913.23e6, 915.48e6), trace="S21") > -15.0
    worst = max(
        figure(data, "gain", "at most", over=band, trace="S21") for band in ((900e6, 907e6), (923e6, 960e6))
    )
    assert_allclose(worst, -49.55, atol=6e-3)


def test_the_handy_limit_sets_that_fail(data: TouchstoneData) -> None:
    """No -3 dB in the pass band; no 20 dB of return loss over it (about 18)."""
    assert figure(data, "gain", "at most", over=(913.23e6, 915.48e6), trace="S21") < -3.0
    assert 17.5 < figure(data, "return loss", "at least", over=(913.23e6, 915.48e6), port=1) < 20.0


def test_a_stop_band_mask_on_the_measured_trace(data: TouchstoneData) -> None:
    """A mask of -40 dB with a step holds exactly where the trace, read sample by sample, is below it."""
    line = MaskLine("at most", np.array([900e6, 907e6, 907e6, 911e6]), np.array([-40.0, -40.0, -38.0, -38.0]))
    inside = line.inside(data.f_hz)
    margin = line.limit_at(data.f_hz[inside]) - decibels(data.two_port.s21)[inside]
    assert inside.sum() == 294
    assert margin.min() > 0.0
    assert line.limit_at(np.array([907e6]))[0] == -40.0


def test_rejection_against_the_measured_pass_band(data: TouchstoneData) -> None:
    """Splitter loss cancels: stop band less the least loss of the pass band."""
    absolute = figure(data, "rejection", over=(923e6, 960e6), trace="S21", against=None)
    relative = figure(data, "rejection", over=(923e6, 960e6), trace="S21", against=(913.2e6, 915.5e6))
    assert_allclose(absolute - relative, 13.685, atol=5e-4)
