"""Shape, flatness and delay figures of a measured cavity band-pass filter.

Data: shared/data/filter_bandpass. Band edges are the README's (relative to the peak, linear in dB); what the
README does not print is worked out here from the reading by other means (numpy polynomials).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.rf.figures import FIGURES
from benchrun.rf.touchstone import TouchstoneData, read

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "filter_bandpass"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")
BAND = (914.25e6, 915.3e6)


@pytest.fixture(scope="module")
def data() -> TouchstoneData:
    name = "bandpass_915.s2p"
    return read((FOLDER / name).read_bytes(), name)


def measure(data: TouchstoneData, name: str, **parameters):
    return FIGURES[name].measure(data.f_hz, data.two_port, "at most", **parameters)


def test_the_shape_factor(data: TouchstoneData) -> None:
    """20 dB over 3 dB band: 3.955 / 2.648 MHz of the README's table."""
    found = measure(data, "shape factor", drop=3.0, outer=20.0, trace="S21")
    assert_allclose(found.value, 3.955 / 2.648, rtol=4e-4)


def test_the_loaded_q(data: TouchstoneData) -> None:
    found = measure(data, "loaded Q", drop=3.0, trace="S21")
    assert_allclose(found.value, np.sqrt(913.046 * 915.694) / 2.648, rtol=4e-4)


def test_a_return_in_the_stop_band_moves_its_edge(data: TouchstoneData) -> None:
    """At 910.0 MHz the README reads -43.41 dB, 29.7 dB below the peak, though 912.18 MHz was 30 dB down."""
    lower = measure(data, "stop-band edge", drop=30.0, edge="lower", trace="S21").value
    upper = measure(data, "stop-band edge", drop=30.0, edge="upper", trace="S21").value
    assert lower < 910.0e6
    assert upper > 916.598e6 + 1e6  # it comes back above as well
    level = 20 * np.log10(np.abs(data.two_port.s21))
    assert np.all(level[data.f_hz < lower] < level.max() - 30.0)
    assert np.all(level[data.f_hz > upper] < level.max() - 30.0)
    beside = level[[np.searchsorted(data.f_hz, lower), np.searchsorted(data.f_hz, upper) - 1]]
    assert np.all(beside > level.max() - 30.0)


def test_the_nearest_stop_band_crossing(data: TouchstoneData) -> None:
    """0.786 MHz below the 1 dB band (912.424, 913.210), and 0.883 MHz above it (915.495, 916.378)."""
    found = measure(data, "nearest stop-band crossing", over=(913.210e6, 915.495e6), drop=20.0, trace="S21")
    assert_allclose(found.value, 0.786e6, atol=1200)
    assert_allclose(found.at_hz, 912.424e6, atol=600)


def test_slope_and_phase_line_against_a_polynomial_fit(data: TouchstoneData) -> None:
    """numpy.polyfit over the same uniform samples; the edges of the band lie on samples."""
    inside = (data.f_hz >= BAND[0] - 1) & (data.f_hz <= BAND[1] + 1)
    f, s21 = data.f_hz[inside], data.two_port.s21[inside]
    assert_allclose([f[0], f[-1]], BAND)
    weight = np.ones(len(f))
    weight[[0, -1]] = np.sqrt(0.5)
    x = (f - f.mean()) / 1e6
    line = np.polyfit(x, 20 * np.log10(np.abs(s21)), 1, w=weight)
    assert_allclose(measure(data, "slope", over=BAND, trace="S21").value, line[0] * 1.05, rtol=1e-9)
    turn = np.polyfit(x, np.unwrap(np.angle(s21)), 1, w=weight)
    length = -turn[0] / 1e6 / (2 * np.pi) * 299792458.0
    assert_allclose(measure(data, "electrical length", over=BAND, trace="S21").value, length, rtol=1e-9)
    left = np.degrees(np.abs(np.unwrap(np.angle(s21)) - np.polyval(turn, x)).max())
    assert_allclose(measure(data, "phase linearity", over=BAND, trace="S21").value, left, rtol=1e-9)


def test_the_delay_falls_into_parts(data: TouchstoneData) -> None:
    """About 328 ns at the peak (README); what the parts leave is smaller than the whole variation."""
    extra = {"over": BAND, "aperture": 300e3, "trace": "S21"}
    whole = float(measure(data, "group delay variation", **extra).value)
    assert float(measure(data, "group delay ripple", **extra).value) < whole
    assert abs(float(measure(data, "group delay parabola", **extra).value)) < whole
    assert 280e-9 < float(measure(data, "group delay", **extra).value) < 480e-9
