"""Group delay and phase against lines and filter prototypes."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(100e6, 200e6, 101)


def of(s21: np.ndarray) -> TwoPort:
    zero = np.zeros(s21.shape, complex)
    return TwoPort(zero, s21.conj(), s21, zero)


def line(tau_s: float, f_hz: np.ndarray = F_HZ) -> TwoPort:
    return of(np.exp(-2j * np.pi * f_hz * tau_s))


def delay(network: TwoPort, side: str = "at most", f_hz: np.ndarray = F_HZ, **parameters):
    parameters = {"aperture": 2e6, "trace": "S21"} | parameters
    return FIGURES["group delay"].measure(f_hz, network, side, **parameters)


@pytest.mark.parametrize("aperture", [1e6, 2e6, 3.3e6, 20e6])
def test_a_line_has_its_own_delay(aperture: float) -> None:
    """The length over the velocity, at any aperture, on the grid or off it."""
    for where in (150e6, 151.37e6, 100e6 + aperture / 2, 200e6 - aperture / 2):
        assert_allclose(delay(line(47e-9), at=where, aperture=aperture).value, 47e-9, rtol=1e-9)


def test_the_reverse_trace_has_its_own_delay() -> None:
    assert_allclose(delay(line(47e-9), at=150e6, trace="S12").value, -47e-9, rtol=1e-9)


BUTTERWORTH = {1: 1.0, 2: 1.41421, 3: 2.0, 4: 2.61313, 5: 3.23607, 6: 3.86370, 7: 4.49396}
CHEBYSHEV = {(3, 0.1): 1.6053, (5, 0.1): 3.5055, (7, 0.1): 5.4874, (3, 0.5): 2.1446, (5, 0.5): 4.2058,
             (7, 0.5): 6.3060, (3, 3.0): 3.7046, (5, 3.0): 6.5120}  # fmt: skip


def prototype(poles: np.ndarray, w: np.ndarray) -> np.ndarray:
    """All-pole low-pass, equal to one at w = 0."""
    return np.prod([-p / (1j * w - p) for p in poles], axis=0)


def delay_at_zero(poles: np.ndarray) -> float:
    """In units of 1/wc, through the figure itself, near f = 0 with a fine grid."""
    f_hz = np.linspace(1.0, 1001.0, 1001)
    network = of(prototype(poles, 2 * np.pi * f_hz / 1e6))  # wc = 1e6 rad/s
    return float(delay(network, f_hz=f_hz, at=100.0, aperture=20.0).value * 1e6)


@pytest.mark.parametrize(("n", "tau"), BUTTERWORTH.items())
def test_butterworth_delay_at_zero(n: int, tau: float) -> None:
    """1/sin(pi/2n): half the sum of the element values (Matthaei, from memory)."""
    poles = np.exp(1j * np.pi * (2 * np.arange(1, n + 1) + n - 1) / (2 * n))
    assert_allclose(delay_at_zero(poles), tau, rtol=1e-5)


@pytest.mark.parametrize(("order", "tau"), CHEBYSHEV.items())
def test_chebyshev_delay_at_zero(order: tuple[int, float], tau: float) -> None:
    """Half the sum of g1..gn for odd order, from the poles on their ellipse (from memory)."""
    n, ripple = order
    a = np.arcsinh(1 / np.sqrt(10 ** (ripple / 10) - 1)) / n
    theta = np.pi * (2 * np.arange(1, n + 1) - 1) / (2 * n)
    poles = -np.sinh(a) * np.sin(theta) + 1j * np.cosh(a) * np.cos(theta)
    assert_allclose(delay_at_zero(poles), tau, rtol=3e-5)


def test_a_quadratic_phase_has_a_linear_delay() -> None:
    """With phi = -2 pi (t0 f + k f^2/2): tau = t0 + k f exactly, by central difference, at grid points."""
    k, t0 = 1e-16, 30e-9
    network = of(np.exp(-2j * np.pi * (t0 * F_HZ + k * F_HZ**2 / 2)))
    greatest = delay(network, over=(110e6, 190e6))
    least = delay(network, "at least", over=(110e6, 190e6))
    assert_allclose([greatest.value, greatest.at_hz], [t0 + k * 190e6, 190e6], rtol=1e-9)
    assert_allclose([least.value, least.at_hz], [t0 + k * 110e6, 110e6], rtol=1e-9)
    variation = FIGURES["group delay variation"].measure(
        F_HZ, network, "at most", over=(110e6, 190e6), aperture=2e6, trace="S21"
    )
    assert_allclose(variation.value, k * 80e6, rtol=1e-8)
    assert_allclose(variation.at_hz, 190e6)


def test_a_line_has_no_variation() -> None:
    found = FIGURES["group delay variation"].measure(
        F_HZ, line(47e-9), "at most", over=(110e6, 190e6), aperture=2e6, trace="S21"
    )
    assert_allclose(found.value, 0.0, atol=1e-18)


@pytest.mark.parametrize("band", [(101e6, 199e6), (101.0e6, 150.4e6), (101.3e6, 198.7e6)])
def test_a_band_may_reach_to_half_an_aperture_from_the_end(band) -> None:
    """Its edges have a value although the samples outside them have none."""
    assert_allclose(delay(line(47e-9), over=band).value, 47e-9, rtol=1e-9)
    found = FIGURES["group delay variation"].measure(
        F_HZ, line(47e-9), "at most", over=band, aperture=2e6, trace="S21"
    )
    assert_allclose(found.value, 0.0, atol=1e-18)


@pytest.mark.parametrize("name", ["group delay", "group delay variation"])
def test_an_aperture_that_reaches_out_of_the_sweep_is_refused(name: str) -> None:
    with pytest.raises(InvalidMeasurement, match=f"{name} is asked from 99.9 MHz"):
        FIGURES[name].measure(F_HZ, line(1e-9), "at most", over=(100.9e6, 150e6), aperture=2e6, trace="S21")


def test_a_wide_aperture_averages_a_ripple() -> None:
    """An aperture of one whole period of a phase ripple sees the mean delay: why it must be stated."""
    phase = -2 * np.pi * F_HZ * 20e-9 + 0.3 * np.sin(2 * np.pi * F_HZ / 10e6)
    network = of(np.exp(1j * phase))
    wide = delay(network, over=(120e6, 180e6), aperture=10e6)
    narrow = delay(network, over=(120e6, 180e6), aperture=2e6)
    assert_allclose(wide.value, 20e-9, rtol=1e-9)
    # Central difference of the sine over a fifth of its period, at its steepest.
    assert_allclose(narrow.value, 20e-9 + 0.3 * 2 * np.sin(np.pi / 5) / (2 * np.pi * 2e6), rtol=1e-9)


def test_phase_is_unwrapped_from_the_start_of_the_sweep() -> None:
    """-360 deg times tau f, continued past a turn; a line of 47 ns turns 4.7 times in 100 MHz."""
    found = FIGURES["phase"].measure(F_HZ, line(47e-9), "at most", at=200e6, trace="S21").value
    start = np.degrees(np.angle(np.exp(-2j * np.pi * 100e6 * 47e-9)))
    assert_allclose(found - start, -360 * 47e-9 * 100e6, rtol=1e-9)


def test_draws_have_their_own_delay() -> None:
    draws = of(np.exp(-2j * np.pi * F_HZ * np.array([[10e-9], [20e-9], [30e-9]])))
    assert_allclose(delay(draws, over=(110e6, 190e6)).value, [10e-9, 20e-9, 30e-9], rtol=1e-9)
    found = FIGURES["group delay variation"].measure(
        F_HZ, draws, "at most", over=(110e6, 190e6), aperture=2e6, trace="S21"
    )
    assert_allclose(found.value, 0.0, atol=1e-17)
