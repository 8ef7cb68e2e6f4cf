"""Flatness and slope against traces whose straight line is known, on any grid."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.fit import fit
from benchrun.rf.twoport import TwoPort

BAND = (110e6, 190e6)


def of_db(db: np.ndarray) -> TwoPort:
    s21 = 10 ** (np.asarray(db) / 20) + 0j
    return TwoPort(0 * s21, s21, s21, 0 * s21)


def measure(name: str, f_hz: np.ndarray, db: np.ndarray, over=BAND):
    return FIGURES[name].measure(f_hz, of_db(db), "at most", over=over, trace="S21")


def ripple(f_hz: np.ndarray, a: float, rise: float) -> np.ndarray:
    """Level -3 dB, ``rise`` dB across the band, and a parabola ``a x^2``."""
    x = 2 * (f_hz - BAND[0]) / (BAND[1] - BAND[0]) - 1
    return -3.0 + rise / 2 * x + a * x**2


GRIDS = {
    "linear": np.linspace(100e6, 200e6, 2001),
    "logarithmic": np.geomspace(100e6, 200e6, 2001),
    "dense at one end": np.concatenate([np.linspace(100e6, 120e6, 1500), np.linspace(120.1e6, 200e6, 800)]),
}


@pytest.mark.parametrize("grid", GRIDS)
def test_the_parts_do_not_depend_on_the_grid(grid: str) -> None:
    """x^2 has mean 1/3 and no slope (integrals): flatness 2/3 a at the edges for a trace without slope."""
    f_hz = GRIDS[grid]
    assert_allclose(measure("slope", f_hz, ripple(f_hz, 0.6, -1.2)).value, -1.2, atol=2e-6)
    assert_allclose(measure("flatness", f_hz, ripple(f_hz, 0.6, 0.0)).value, 0.4, atol=1e-5)
    found = measure("flatness about the slope", f_hz, ripple(f_hz, 0.6, -1.2))
    assert_allclose(found.value, 0.4, atol=1e-5)
    assert min(abs(found.at_hz - edge) for edge in BAND) < 1.0


def test_flatness_says_where_the_trace_is_farthest_from_its_mean() -> None:
    """A tilt of 2 dB is 1 dB off at either edge; with a hump it is the edge on the far side."""
    f_hz = GRIDS["linear"]
    found = measure("flatness", f_hz, ripple(f_hz, 0.3, 2.0))
    assert_allclose([found.value, found.at_hz], [1.2, 190e6], rtol=1e-6)


def test_a_flat_trace_is_flat() -> None:
    f_hz = GRIDS["logarithmic"]
    for name in ("flatness", "slope", "flatness about the slope"):
        assert_allclose(measure(name, f_hz, np.full(2001, -0.7)).value, 0.0, atol=1e-12)


def test_two_samples_make_a_line_without_rest() -> None:
    """A band narrower than the step has its two interpolated edges, and nothing else."""
    f_hz = np.linspace(100e6, 200e6, 11)
    db = np.linspace(-3, -5, 11)
    assert_allclose(measure("slope", f_hz, db, (122e6, 128e6)).value, -0.12, rtol=1e-9)
    assert_allclose(measure("flatness about the slope", f_hz, db, (122e6, 128e6)).value, 0.0, atol=1e-12)
    assert np.isnan(fit(np.array([1.0, 2.0]), np.array([1.0, 5.0]), 2).parabolic)


def test_refining_the_grid_converges() -> None:
    """To the integral, with the square of the step: a sine of one and a half periods over the band."""
    a = 1.5 * np.pi
    exact = 6 * (np.sin(a) - a * np.cos(a)) / a**2  # twice 3/2 of the integral of x sin(a x), Legendre
    errors = []
    for points in (21, 81, 321):
        f_hz = np.linspace(*BAND, points)
        x = 2 * (f_hz - BAND[0]) / (BAND[1] - BAND[0]) - 1
        found = measure("slope", f_hz, np.sin(a * x)).value
        errors.append(abs(float(found) - exact))
    assert errors[1] < errors[0] / 10
    assert errors[2] < 1e-3


@settings(derandomize=True, max_examples=30, deadline=None)
@given(rise=st.floats(-20, 20), a=st.floats(-5, 5), gain=st.floats(-80, 20), factor=st.floats(0.01, 100))
def test_level_and_frequency_scale_have_no_say(rise: float, a: float, gain: float, factor: float) -> None:
    f_hz = GRIDS["linear"][::10]
    db, over = ripple(f_hz, a, rise), (BAND[0] * factor, BAND[1] * factor)
    for name in ("flatness", "slope", "flatness about the slope"):
        one = measure(name, f_hz, db).value
        assert_allclose(measure(name, f_hz * factor, db + gain, over).value, one, atol=1e-9)


@settings(derandomize=True, max_examples=20, deadline=None)
@given(rises=st.lists(st.floats(-10, 10), min_size=2, max_size=6))
def test_draws_rise_as_their_trace_does(rises) -> None:
    """Monotone in the rise, and each draw its own."""
    f_hz = GRIDS["logarithmic"]
    found = measure("slope", f_hz, np.stack([ripple(f_hz, 0.2, rise) for rise in rises])).value
    assert_allclose(found, rises, atol=1e-5)
