"""Reference impedances: against scikit-rf in all three kinds of wave, and against plain physics."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose

from benchrun.rf.deembedding.impedance import renormalise, renormalise_reflection
from benchrun.rf.twoport import TwoPort

POINTS = 7
IMPEDANCES = {
    "real": ((50.0, 50.0), (75.0, 75.0)),
    "unlike": ((50.0, 50.0), (25.0, 300.0)),
    "complex": ((50.0, 75.0), (20 - 30j, 90 + 15j)),
    "from complex": ((20 - 30j, 90 + 15j), (50.0, 40 + 5j)),
}
THEIRS = {"power": "power", "pseudo": "pseudo", "travelling": "traveling"}


def some(seed: int) -> TwoPort:
    g = np.random.default_rng(seed)
    return TwoPort(
        *(g.uniform(0, 0.9, POINTS) * np.exp(2j * np.pi * g.uniform(size=POINTS)) for _ in range(4))
    )


@pytest.mark.parametrize("wave", THEIRS)
@pytest.mark.parametrize("case", IMPEDANCES)
def test_scikit_rf_agrees(case: str, wave: str) -> None:
    old, new = IMPEDANCES[case]
    two = some(1)
    theirs = skrf.network.renormalize_s(two.matrix, np.array(old), np.array(new), THEIRS[wave])
    assert_allclose(renormalise(two, old, new, wave).matrix, theirs, atol=1e-12)


@pytest.mark.parametrize("wave", THEIRS)
def test_there_and_back(wave: str) -> None:
    two, (old, new) = some(2), IMPEDANCES["complex"]
    assert_allclose(
        renormalise(renormalise(two, old, new, wave), new, old, wave).matrix, two.matrix, atol=1e-13
    )


@pytest.mark.parametrize("wave", THEIRS)
def test_a_one_port_is_a_two_port_that_passes_nothing(wave: str) -> None:
    two, zero = some(3), np.zeros(POINTS, complex)
    alone = renormalise_reflection(two.s11, 50.0, 20 - 30j, wave)
    both = renormalise(TwoPort(two.s11, zero, zero, two.s22), (50.0, 50.0), (20 - 30j, 50.0), wave)
    assert_allclose(alone, both.s11, atol=1e-14)
    assert_allclose(both.s22, two.s22, atol=1e-14)


def test_an_impedance_for_each_frequency() -> None:
    two, z = some(4), np.linspace(40, 60, POINTS) + 1j * np.linspace(-5, 5, POINTS)
    whole = renormalise(two, (z, 50.0), (50.0, 50.0), "pseudo")
    for k in range(POINTS):
        one = renormalise(two.map(lambda p, k=k: p[k : k + 1]), (z[k], 50.0), (50.0, 50.0), "pseudo")
        assert_allclose(whole.matrix[k], one.matrix[0], atol=1e-14)


def test_power_waves_keep_passivity_and_a_conjugate_match_at_zero() -> None:
    """A load of 20 + 30j on a reference of 20 - 30j takes all power: no reflected power wave."""
    reflection = np.array([(20 + 30j - 50) / (20 + 30j + 50)])
    assert_allclose(renormalise_reflection(reflection, 50.0, 20 - 30j, "power"), 0.0, atol=1e-15)


def test_minimum_loss_pad_from_75_to_50_ohm() -> None:
    """43.3013 in series and 86.6025 across: matched on both sides, 5.7195 dB (pads, any text)."""
    r, g = 43.3013, 1 / 86.6025
    a, b, c, d = 1 + r * g, r, g, 1.0  # ABCD, seen from 75 ohm
    den = a * 50 + b + c * 50 * 50 + d * 50
    s = np.array([[[(a * 50 + b - c * 2500 - d * 50) / den, 100 * (a * d - b * c) / den],
                   [100 / den, (-a * 50 + b - c * 2500 + d * 50) / den]]])  # fmt: skip
    pad = renormalise(TwoPort.of(s), (50, 50), (75, 50))
    assert_allclose([abs(pad.s11[0]), abs(pad.s22[0])], 0.0, atol=1e-5)
    assert_allclose(-20 * np.log10(abs(pad.s21[0])), 5.7195, atol=1e-4)
    assert_allclose(pad.s21, pad.s12, atol=1e-12)


@pytest.mark.parametrize("bad", [0.0, -50.0, 30j])
def test_an_impedance_without_positive_real_part_is_refused(bad: complex) -> None:
    with pytest.raises(ValueError, match="needs a positive real part, got"):
        renormalise(some(5), (50, 50), (50, bad))
