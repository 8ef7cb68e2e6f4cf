"""Figures of frequency against analytic responses."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.crossing import edge
from benchrun.rf.twoport import TwoPort


def of_db(db: np.ndarray) -> TwoPort:
    zero, s21 = np.zeros(db.shape, complex), 10 ** (db / 20) + 0j
    return TwoPort(zero, s21, s21, zero)


def corner(f_hz, db, drop: float = 3.0, edge_: str = "upper", trace: str = "S21"):
    return FIGURES["corner frequency"].measure(f_hz, of_db(db), "at most", drop=drop, edge=edge_, trace=trace)


@pytest.mark.parametrize("n", [1, 2, 3, 5, 7])
@pytest.mark.parametrize("drop", [1.0, 3.0, 10.0, 20.0])
def test_a_butterworth_corner(n: int, drop: float) -> None:
    """Closed form: f = fc (10^(A/10) - 1)^(1/2n), against a peak at the start of the sweep."""
    f_hz = np.linspace(1e6, 12e9, 24001)
    found = corner(f_hz, -10 * np.log10(1 + (f_hz / 1e9) ** (2 * n)), drop)
    expected = 1e9 * (10 ** (drop / 10) - 1) ** (1 / (2 * n))
    assert_allclose(found.value, expected, rtol=1e-5)
    assert_allclose(found.at_hz, found.value)


@pytest.mark.parametrize(("n", "ripple", "ratio"), [(3, 0.1, 1.3890), (5, 0.1, 1.1347), (3, 0.5, 1.1675),
                                                    (5, 0.5, 1.0593)])  # fmt: skip
def test_the_three_decibel_edge_of_a_chebyshev(n: int, ripple: float, ratio: float) -> None:
    """cosh(acosh(1/e)/n), with the half-power point: 3.0103 dB (Matthaei, from memory)."""
    x = np.linspace(0.0, 2.0, 40001)
    t = np.where(x <= 1, np.cos(n * np.arccos(np.minimum(x, 1))), np.cosh(n * np.arccosh(np.maximum(x, 1))))
    db = -10 * np.log10(1 + (10 ** (ripple / 10) - 1) * t**2)
    assert_allclose(corner(x * 1e9, db, 10 * np.log10(2)).value / 1e9, ratio, atol=1e-4)


def resonator_db(f_hz: np.ndarray, f0: float, q: float) -> np.ndarray:
    """A single tuned circuit: 1 / (1 + Q^2 (f/f0 - f0/f)^2)."""
    return -10 * np.log10(1 + (q * (f_hz / f0 - f0 / f_hz)) ** 2)


def test_a_resonator_has_the_bandwidth_f0_over_q() -> None:
    """At the half-power points exactly f0/Q, and their product is f0 squared (any circuit text)."""
    f_hz, half = np.linspace(150e6, 190e6, 8001), 10 * np.log10(2)
    network = of_db(resonator_db(f_hz, 169.4e6, 25.0))
    width = FIGURES["bandwidth"].measure(f_hz, network, "at most", drop=half, trace="S21")
    middle = FIGURES["centre frequency"].measure(f_hz, network, "at most", drop=half, trace="S21")
    assert_allclose(width.value, 169.4e6 / 25.0, rtol=1e-6)
    # The mean of both edges lies above f0 by f0/(8 Q^2).
    assert_allclose(middle.value, 169.4e6 * np.sqrt(1 + 1 / (4 * 25.0**2)), rtol=1e-8)
    assert_allclose(width.at_hz, middle.value)
    low = corner(f_hz, resonator_db(f_hz, 169.4e6, 25.0), half, "lower").value
    high = corner(f_hz, resonator_db(f_hz, 169.4e6, 25.0), half, "upper").value
    assert_allclose(np.sqrt(low * high), 169.4e6, rtol=1e-7)


def test_between_samples_the_level_is_linear_in_decibels() -> None:
    found = corner(np.array([1e9, 2e9, 3e9]), np.array([0.0, -1.0, -5.0]))
    assert_allclose(found.value, 2.5e9)


def test_a_sample_exactly_on_the_threshold_is_the_corner() -> None:
    assert_allclose(edge(np.array([1.0, 2.0, 3.0]), np.array([0.0, -3.0, -9.0]), 3.0, True), 2.0)


def test_the_last_sample_exactly_on_the_threshold_is_still_a_corner() -> None:
    """The response has fallen by the drop, not by more: equality belongs to the corner."""
    assert_allclose(edge(np.array([1.0, 2.0, 3.0]), np.array([0.0, -1.0, -3.0]), 3.0, True), 3.0)
    assert_allclose(edge(np.array([1.0, 2.0, 3.0]), np.array([-3.0, -1.0, 0.0]), 3.0, False), 1.0)


def test_of_several_crossings_the_nearest_to_the_peak_counts() -> None:
    """A stop band that comes back later does not move the corner."""
    f_hz = np.arange(1.0, 9.0)
    db = np.array([-20.0, -6.0, -2.0, 0.0, -2.0, -6.0, -1.0, -20.0])
    assert_allclose(edge(f_hz, db, 4.0, True), 5.5)
    assert_allclose(edge(f_hz, db, 4.0, False), 2.5)


def test_a_loss_under_the_peak_does_not_matter() -> None:
    """Edges are relative: 13.7 dB of splitter change nothing."""
    f_hz = np.linspace(1e6, 3e9, 3001)
    db = -10 * np.log10(1 + (f_hz / 1e9) ** 10)
    assert_allclose(corner(f_hz, db - 13.7).value, corner(f_hz, db).value, rtol=1e-12)


@pytest.mark.parametrize("name", ["corner frequency", "bandwidth", "centre frequency"])
def test_a_trace_that_never_falls_is_invalid(name: str) -> None:
    """No number may stand for a corner that lies outside the sweep."""
    f_hz = np.linspace(1e6, 1e9, 101)
    parameters = {"drop": 3.0, "trace": "S21"} | ({"edge": "upper"} if name == "corner frequency" else {})
    with pytest.raises(InvalidMeasurement, match=f"{name} cannot be told") as caught:
        FIGURES[name].measure(f_hz, of_db(np.linspace(0, -2.9, 101)), "at most", **parameters)
    assert "trace" in caught.value.advice


def test_a_low_pass_has_no_lower_corner() -> None:
    f_hz = np.linspace(1e6, 3e9, 301)
    with pytest.raises(InvalidMeasurement, match="cannot be told"):
        corner(f_hz, -10 * np.log10(1 + (f_hz / 1e9) ** 10), 3.0, "lower")


def test_a_high_pass_has_one() -> None:
    f_hz = np.linspace(0.1e9, 3e9, 30001)
    db = -10 * np.log10(1 + (1e9 / f_hz) ** 10)
    assert_allclose(corner(f_hz, db, 10 * np.log10(2), "lower").value, 1e9, rtol=3e-3)


def test_draws_that_never_fall_give_nan_and_the_others_their_corner() -> None:
    """With a draw axis no draw may spoil the rest."""
    f_hz = np.linspace(1e6, 3e9, 3001)
    rows = np.stack([-10 * np.log10(1 + (f_hz / fc) ** 6) for fc in (1e9, 1.1e9, 9e9)])
    found = corner(f_hz, rows).value
    assert found.shape == (3,)
    assert_allclose(found[:2], [corner(f_hz, rows[0]).value, corner(f_hz, rows[1]).value], rtol=0)
    assert np.isnan(found[2])


def test_the_lower_edge_is_the_upper_edge_in_a_mirror() -> None:
    """Reversed in frequency, upper and lower change places."""
    generator = np.random.default_rng(5)
    f_hz = np.cumsum(generator.uniform(0.5, 2.0, 200))
    db = -20 * np.abs(np.linspace(-1, 1, 200)) + generator.normal(0, 0.5, 200)
    assert_allclose(edge(f_hz, db, 6.0, False), -edge(-f_hz[::-1], db[::-1], 6.0, True))
