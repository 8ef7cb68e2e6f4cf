"""Phase linearity, electrical length and the parts of group delay, against phases written by hand."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.linear import LIGHT
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(100e6, 200e6, 401)
BAND = (110e6, 190e6)
X = 2 * (F_HZ - BAND[0]) / (BAND[1] - BAND[0]) - 1
APERTURE = 2e6


def of(s21: np.ndarray) -> TwoPort:
    return TwoPort(0 * s21, s21, s21, 0 * s21)


def of_delay(constant_s: float, rise_s: float = 0.0, bow_s: float = 0.0) -> TwoPort:
    """Group delay ``constant + rise x / 2 + bow x^2``: its integral over angular frequency is the phase."""
    half = (BAND[1] - BAND[0]) / 2
    area = half * (constant_s * X + rise_s * X**2 / 4 + bow_s * X**3 / 3)
    return of(np.exp(-2j * np.pi * area))


def measure(name: str, network: TwoPort, f_hz: np.ndarray = F_HZ, over=BAND, **parameters):
    if "aperture" in FIGURES[name].parameters:
        parameters = {"aperture": APERTURE, **parameters}
    return FIGURES[name].measure(f_hz, network, "at most", over=over, trace="S21", **parameters)


@pytest.mark.parametrize("length_m", [0.0, 0.3, 14.989, 299.792458])
def test_the_electrical_length_of_a_line(length_m: float) -> None:
    """Delay times c: 1 us is 299.792 458 m (the SI definition of the metre)."""
    network = of(0.8 * np.exp(-2j * np.pi * F_HZ * length_m / LIGHT + 1.1j))
    found = measure("electrical length", network)
    assert_allclose(found.value, length_m, rtol=1e-9, atol=1e-12)
    assert found.at_hz == 150e6
    assert_allclose(measure("phase linearity", network).value, 0.0, atol=1e-6)


def test_a_dielectric_line_is_electrically_longer() -> None:
    """By the root of its permittivity: 100 mm at 2.25 are 150 mm of empty space."""
    velocity = LIGHT / np.sqrt(2.25)
    found = measure("electrical length", of(np.exp(-2j * np.pi * F_HZ * 0.1 / velocity)))
    assert_allclose(found.value, 0.15, rtol=1e-9)


def test_phase_linearity_of_a_parabola() -> None:
    """A bow a x^2 departs from its line (a/3) by 2/3 a at the edges, on whatever delay it rides."""
    network = of(np.exp(1j * (np.radians(30) * X**2 - 2 * np.pi * F_HZ * 200e-9)))
    found = measure("phase linearity", network)
    assert_allclose(found.value, 20.0, rtol=2e-4)
    assert found.at_hz in BAND


@pytest.mark.parametrize(("rise", "bow"), [(0, 0), (5e-9, 0), (0, -3e-9), (-2e-9, 4e-9)])
def test_the_parts_of_the_group_delay(rise: float, bow: float) -> None:
    """A central difference over the aperture a adds a third of (a/band)^2 of the bow to the constant only."""
    network = of_delay(40e-9, rise, bow)
    assert_allclose(measure("group delay slope", network).value, rise, atol=1e-15)
    assert_allclose(measure("group delay parabola", network).value, bow, atol=1e-15)
    assert measure("group delay ripple", network).value < 1e-14


def test_the_ripple_is_what_the_parabola_leaves() -> None:
    """Ten periods over the band are nearly orthogonal to a parabola: the peak to peak of the sine."""
    phase = 2 * np.pi * F_HZ * 40e-9 + 0.02 * np.sin(2 * np.pi * (F_HZ - 150e6) / 8e6)
    found = measure("group delay ripple", of(np.exp(-1j * phase)), aperture=0.5e6)
    # The slope of the sine at its steepest, by a central difference over a sixteenth of a period.
    exact = 2 * 0.02 * np.sin(np.pi / 16) * 2 / (2 * np.pi * 0.5e6)
    assert_allclose(found.value, exact, rtol=2e-2)


def test_two_samples_have_no_parabola() -> None:
    """A band narrower than a step: nothing is told, rather than nothing curved."""
    with pytest.raises(InvalidMeasurement, match="group delay parabola cannot be told"):
        measure("group delay parabola", of_delay(40e-9), over=(150.02e6, 150.2e6))
    with pytest.raises(InvalidMeasurement, match="group delay ripple cannot be told"):
        measure("group delay ripple", of_delay(40e-9), over=(150.02e6, 150.2e6))


def test_the_aperture_counts_at_the_sweep_s_ends() -> None:
    for name in ("group delay slope", "group delay parabola", "group delay ripple"):
        with pytest.raises(InvalidMeasurement, match=f"{name} is asked from 99.5 MHz"):
            measure(name, of_delay(40e-9), over=(100.5e6, 150e6))


def test_refining_the_grid_converges() -> None:
    """Phase linearity of a sine ripple, towards the one on a very fine grid."""
    values = []
    for points in (51, 201, 801, 12801):
        f_hz = np.linspace(100e6, 200e6, points)
        phase = np.sin(2 * np.pi * (f_hz - 100e6) / 37e6) - 2 * np.pi * f_hz * 20e-9
        values.append(float(measure("phase linearity", of(np.exp(1j * phase)), f_hz).value))
    errors = np.abs(np.array(values[:-1]) - values[-1])
    assert errors[1] < errors[0] / 4
    assert errors[2] < 1e-2


@settings(derandomize=True, max_examples=30, deadline=None)
@given(
    tau=st.floats(-100e-9, 100e-9), turn=st.floats(-3.1, 3.1), factor=st.floats(0.1, 10.0),
    bow=st.floats(-20e-9, 20e-9),
)  # fmt: skip
def test_an_added_delay_adds_its_length_only(tau: float, turn: float, factor: float, bow: float) -> None:
    network = of_delay(10e-9, 3e-9, bow)
    longer = network.map(lambda s: s * 0.3 * np.exp(-2j * np.pi * F_HZ * tau + 1j * turn))
    before, after = measure("electrical length", network).value, measure("electrical length", longer).value
    assert_allclose(after - before, tau * LIGHT, rtol=1e-6, atol=1e-9)
    for name in ("phase linearity", "group delay slope", "group delay parabola", "group delay ripple"):
        assert_allclose(measure(name, longer).value, measure(name, network).value, rtol=1e-6, atol=1e-12)
    scaled = measure("electrical length", network, F_HZ * factor, tuple(b * factor for b in BAND)).value
    assert_allclose(scaled, before / factor, rtol=1e-9)


def test_draws_have_their_own_parts() -> None:
    rises = np.array([1e-9, -2e-9, 5e-9])
    network = of(np.stack([of_delay(40e-9, rise).s21 for rise in rises]))
    assert_allclose(measure("group delay slope", network).value, rises, atol=1e-15)
