"""Impedance figures against circuits whose impedance is known."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(100e6, 200e6, 201)
FIVE = ("resistance", "reactance", "impedance", "parallel resistance", "parallel reactance")


def gamma(z_ohm, z0: float = 50.0) -> np.ndarray:
    return np.broadcast_to((z_ohm - z0) / (z_ohm + z0), F_HZ.shape).astype(complex)


def value(name: str, plane: np.ndarray, side: str = "at most", **parameters) -> float:
    defaults = {"port": 1} | ({} if name == "Q" else {"reference": 50.0})
    return float(FIGURES[name].measure(F_HZ, plane, side, **{**defaults, **parameters}).value)


@pytest.mark.parametrize(
    ("z_ohm", "expected"),
    [
        (25 + 0j, (25, 0, 25, 25, None)),
        (30 - 40j, (30, -40, 50, 2500 / 30, -2500 / 40)),
        (200 - 100j, (200, -100, np.hypot(200, 100), 250, -500)),
        (1e-3 + 1e3j, (1e-3, 1e3, 1e3, 1e9, 1e3)),
    ],
)
def test_a_lumped_impedance(z_ohm: complex, expected) -> None:
    """Series R + jX is parallel |Z|^2/R and |Z|^2/X (definition): Y = 1/Z worked out apart."""
    for name, wanted in zip(FIVE, expected, strict=True):
        if wanted is not None:
            assert_allclose(value(name, gamma(z_ohm), at=150e6), wanted, rtol=2e-7, atol=1e-12)


def test_the_q_of_a_lossy_coil_rises_with_frequency() -> None:
    """Q = omega L / R: 20 nH and 0.5 ohm."""
    z = 0.5 + 2j * np.pi * F_HZ * 20e-9
    assert_allclose(value("Q", gamma(z), over=(120e6, 180e6)), 2 * np.pi * 180e6 * 20e-9 / 0.5, rtol=1e-9)
    assert_allclose(value("Q", gamma(z), "at least", at=100e6), 2 * np.pi * 100e6 * 20e-9 / 0.5, rtol=1e-9)


def test_q_is_the_same_in_series_and_in_parallel() -> None:
    """|X|/R of the impedance is |B|/G of the admittance."""
    plane = gamma(7 - 91j)
    apart = abs(value("parallel resistance", plane, at=1.5e8) / value("parallel reactance", plane, at=1.5e8))
    assert_allclose(value("Q", plane, at=1.5e8), apart, rtol=1e-12)
    assert_allclose(apart, 13.0, rtol=1e-12)


@settings(derandomize=True, max_examples=40, deadline=None)
@given(r=st.floats(0.1, 1e4), x=st.floats(-1e4, 1e4), z0=st.floats(10, 300), factor=st.floats(0.1, 10.0))
def test_impedance_scales_with_its_reference(r: float, x: float, z0: float, factor: float) -> None:
    """The same reflection at another reference means an impedance as many times greater."""
    plane = gamma(complex(r, x), z0)
    for name in FIVE:
        if name == "parallel reactance" and abs(x) < 1e-3:
            continue
        one = value(name, plane, at=150e6, reference=z0)
        assert_allclose(value(name, plane, at=150e6, reference=z0 * factor), one * factor, rtol=1e-9)
    assert_allclose(value("resistance", plane, at=150e6, reference=z0), r, rtol=1e-7, atol=1e-6)
    assert_allclose(value("reactance", plane, at=150e6, reference=z0), x, rtol=1e-7, atol=1e-6)


def test_a_line_to_a_short_between_samples() -> None:
    """Z0 tan(beta l) halfway between two samples: the chord of the circle, second order in the step."""
    tau, where = 0.5e-9, 150.25e6
    exact = 50 * np.tan(2 * np.pi * where * tau)
    errors = []
    for points in (101, 201, 401):
        f = np.linspace(100.3e6, 200.3e6, points)
        plane = -np.exp(-4j * np.pi * f * tau)
        found = FIGURES["reactance"].measure(f, plane, "at most", at=where, port=1, reference=50.0)
        errors.append(abs(float(found.value) - exact) / exact)
    assert errors[0] < 1e-4
    assert errors[2] < errors[0] / 4


@pytest.mark.parametrize(
    ("name", "plane"),
    [
        ("resistance", 1.0), ("reactance", 1.0), ("impedance", 1.0), ("parallel resistance", -1.0),
        ("parallel reactance", -1.0), ("parallel reactance", 0.5), ("Q", 1j),
    ],
)  # fmt: skip
def test_a_pole_has_no_value(name: str, plane: complex) -> None:
    """A perfect open has no series value, a short no parallel one, a real load no parallel reactance."""
    with pytest.raises(InvalidMeasurement, match=f"{name} cannot be told"):
        value(name, np.full(F_HZ.shape, plane, complex), at=150e6)


def test_a_draw_at_a_pole_is_nan_and_leaves_the_others() -> None:
    planes = np.stack([gamma(10 + 0j), np.ones(F_HZ.shape, complex), gamma(90 + 0j)])
    found = FIGURES["resistance"].measure(F_HZ, planes, "at most", at=150e6, port=1, reference=50.0).value
    assert_allclose(found, [10.0, np.nan, 90.0], rtol=1e-12)


def test_the_figures_take_either_port() -> None:
    """Port 2 of a two-port is read from S22."""
    none = np.zeros(F_HZ.shape, complex)
    two = TwoPort(gamma(20 + 0j), none, none, gamma(80 + 0j))
    for port, wanted in ((1, 20.0), (2, 80.0)):
        found = FIGURES["resistance"].measure(F_HZ, two, "at most", at=1.5e8, port=port, reference=50.0)
        assert_allclose(found.value, wanted, rtol=1e-12)
