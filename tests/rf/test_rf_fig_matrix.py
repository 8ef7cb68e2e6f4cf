"""Isolation, directivity, balance and passivity of matrices written by hand."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.matrix import greatest_gain
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(100e6, 200e6, 11)
BAND = (120e6, 180e6)


def flat(s11=0.0, s12=0.0, s21=0.0, s22=0.0) -> TwoPort:
    return TwoPort(*(np.full(F_HZ.shape, complex(s)) for s in (s11, s12, s21, s22)))


def value(name: str, network: TwoPort, side: str = "at most", **parameters) -> float:
    return float(FIGURES[name].measure(F_HZ, network, side, over=BAND, **parameters).value)


def test_an_amplifier_stage() -> None:
    """20 dB gain and 35 dB isolation: directivity is their sum (definition)."""
    stage = flat(0.1, 10 ** (-35 / 20), 10.0, 0.2j)
    assert_allclose(value("isolation", stage, trace="S12"), 35.0, rtol=1e-12)
    assert_allclose(value("directivity", stage, trace="S21"), 55.0, rtol=1e-12)
    assert_allclose(value("directivity", stage.flipped(), trace="S12"), 55.0, rtol=1e-12)
    assert_allclose(value("port balance", stage), np.hypot(0.1, 0.2), rtol=1e-12)


def test_a_reciprocal_part_has_no_directivity() -> None:
    assert value("directivity", flat(0.3, 0.2j, 0.2j, -0.5), trace="S21") == 0.0


def test_isolation_over_a_band_is_its_worst_sample() -> None:
    s12 = 10 ** (-np.linspace(30, 40, 11) / 20) + 0j
    network = TwoPort(0 * s12, s12, s12, 0 * s12)
    found = FIGURES["isolation"].measure(F_HZ, network, "at least", over=BAND, trace="S12")
    assert_allclose([found.value, found.at_hz], [32.0, 120e6], rtol=1e-9)


@pytest.mark.parametrize(
    ("network", "gain"),
    [
        (flat(s12=1, s21=1), 1.0),  # a thru
        (flat(0.6, 0.8, 0.8, -0.6), 1.0),  # a lossless mismatch, unitary
        (flat(s12=0.5, s21=0.5), 0.5),  # a matched 6 dB pad
        (flat(s21=10.0), 10.0),  # a matched amplifier
        (flat(1 / 3, 2 / 3, 2 / 3, 1 / 3), 1.0),  # a series resistor of 2 Z0 / 2: lossy, yet 1 in common mode
        (flat(0.7, 0.0, 0.0, -0.2), 0.7),
    ],
)
def test_the_greatest_singular_value(network: TwoPort, gain: float) -> None:
    assert_allclose(value("passivity", network), gain, rtol=1e-7)


@settings(derandomize=True, max_examples=50, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), rank=st.booleans())
def test_the_closed_form_is_the_singular_value(seed: int, rank: bool) -> None:
    """Against numpy's decomposition, for full and nearly singular matrices."""
    generator = np.random.default_rng(seed)
    s = generator.normal(size=(3, 11, 2, 2)) + 1j * generator.normal(size=(3, 11, 2, 2))
    if rank:
        s[..., 1, :] = s[..., 0, :] * 0.3j
    assert_allclose(greatest_gain(TwoPort.of(s)), np.linalg.svd(s, compute_uv=False)[..., 0], rtol=1e-9)


@settings(derandomize=True, max_examples=30, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), factor=st.floats(1e-3, 1e3))
def test_passivity_scales_and_ports_may_be_exchanged(seed: int, factor: float) -> None:
    generator = np.random.default_rng(seed)
    s = TwoPort.of(generator.normal(size=(11, 2, 2)) + 1j * generator.normal(size=(11, 2, 2)))
    one = value("passivity", s)
    assert_allclose(value("passivity", s.map(lambda p: p * factor)), one * factor, rtol=1e-9)
    assert_allclose(value("passivity", s.flipped()), one, rtol=1e-12)
    assert_allclose(value("port balance", s.flipped()), value("port balance", s), rtol=1e-12)
    assert_allclose(
        value("directivity", s.map(lambda p: p * factor), trace="S21"), value("directivity", s, trace="S21"),
        atol=1e-9,
    )  # fmt: skip
