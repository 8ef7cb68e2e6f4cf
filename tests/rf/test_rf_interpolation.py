"""S-parameters between the points of a file: exact where they can be, and honest about the rest."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.rf.interpolation import resample, resampling_error


@pytest.mark.parametrize("order", [1, 2, 3])
def test_a_polynomial_of_the_order_is_exact(order: int) -> None:
    """Lagrange interpolation (any numerical text), on an uneven grid, near the ends too."""
    x = np.array([1.0, 1.3, 2.0, 2.2, 3.1, 4.0, 4.4])
    wanted = np.linspace(1.0, 4.4, 41)
    coefficients = np.array([0.3 - 0.1j, -0.2 + 0.5j, 0.1j, 0.04])[: order + 1]

    def polynomial(f: np.ndarray) -> np.ndarray:
        return np.polynomial.polynomial.polyval(f, coefficients)

    assert_allclose(resample(x, polynomial(x), wanted, order), polynomial(wanted), atol=1e-13)


def test_the_points_themselves_come_back() -> None:
    generator = np.random.default_rng(1)
    x = np.cumsum(generator.uniform(0.5, 2.0, 20))
    plane = generator.standard_normal(20) + 1j * generator.standard_normal(20)
    assert_allclose(resample(x, plane, x), plane, atol=1e-13)


@pytest.mark.parametrize(("order", "power"), [(1, 2), (2, 3), (3, 4)])
def test_the_error_falls_with_the_step(order: int, power: int) -> None:
    """Half the step leaves the (order + 1)-th power of a half: a line of 2 ns over 1 GHz."""

    def error(points: int) -> float:
        f_hz, wanted = np.linspace(1e9, 2e9, points), np.linspace(1.2e9, 1.8e9, 777)
        exact = np.exp(-2j * np.pi * wanted * 2e-9)
        return float(np.abs(resample(f_hz, np.exp(-2j * np.pi * f_hz * 2e-9), wanted, order) - exact).max())

    assert_allclose(error(101) / error(201), 2.0**power, rtol=0.06)


def test_the_estimated_error_bounds_the_true_one() -> None:
    """The difference to one order less is larger than what the higher order leaves, for a smooth trace."""
    f_hz, wanted = np.linspace(1e9, 2e9, 101), np.linspace(1.01e9, 1.99e9, 500)
    plane = np.exp(-2j * np.pi * f_hz * 3e-9)
    true = np.abs(resample(f_hz, plane, wanted) - np.exp(-2j * np.pi * wanted * 3e-9)).max()
    estimate = resampling_error(f_hz, plane, wanted)
    assert true < estimate < 50 * true


def test_a_magnitude_that_passes_zero_keeps_no_kink() -> None:
    """A notch in the complex plane is a straight line there: interpolated through zero exactly."""
    f_hz = np.linspace(0.0, 10.0, 11)
    plane = (0.3 + 0.4j) * (f_hz - 5.25)
    assert_allclose(
        resample(f_hz, plane, np.array([5.25, 5.0, 5.5])), [0, -0.075 - 0.1j, 0.075 + 0.1j], atol=1e-14
    )


@pytest.mark.parametrize("points", [2, 3])
def test_few_points_lower_the_order(points: int) -> None:
    x = np.arange(float(points))
    assert_allclose(resample(x, x + 0j, np.array([0.25, 0.75])), [0.25, 0.75], atol=1e-15)


def test_leading_axes_are_kept() -> None:
    x, wanted = np.linspace(0, 1, 9), np.array([0.1, 0.55, 0.9])
    rows = np.stack([x**2 + 1j * x, 3 * x + 0j])
    found = resample(x, rows, wanted)
    assert found.shape == (2, 3)
    assert_allclose(found, np.stack([wanted**2 + 1j * wanted, 3 * wanted + 0j]), atol=1e-14)
