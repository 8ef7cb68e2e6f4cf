"""Quality metrics and fixture classes: computed vectors, scikit-rf, and the limits themselves."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose
from skrf.calibration.deembedding import IEEEP370_FD_QM

from benchrun.rf.deembedding.quality import (
    FixtureClass,
    Quality,
    causality_percent,
    fixture_class,
    impedance_class,
    largest_gain,
    passivity_percent,
    quality,
    reciprocity_percent,
)
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(0.01e9, 20e9, 2000)


def lossy_line() -> TwoPort:
    """30 mm of 55 ohm line, gamma = 0.2 sqrt(GHz) + j w / c, in 50 ohm."""
    gl = (0.2 * np.sqrt(F_HZ / 1e9) + 2j * np.pi * F_HZ / 299_792_458.0) * 0.03
    g, e = (55 - 50) / (55 + 50), np.exp(-gl)
    d = 1 - g**2 * e**2
    s11, s21 = g * (1 - e**2) / d, (1 - g**2) * e / d
    return TwoPort(s11, s21, s21, s11)


LINE = lossy_line()


def test_a_good_line() -> None:
    """Causality 99.9764 %, passivity and reciprocity 100 % (computed with scikit-rf 2.2.0)."""
    found = quality(LINE)
    assert_allclose(found.causality, 99.9764, atol=1e-4)
    assert (found.passivity, found.reciprocity) == (100.0, 100.0)
    assert set(found.grades.values()) == {"good"}


def test_a_line_that_gains_five_per_cent() -> None:
    """Scaled to a 2-norm of 1.05 everywhere: 100 (1 - (1.05 - 1.00001) / 0.1) = 50.01 %."""
    size = largest_gain(LINE)
    assert_allclose(passivity_percent(LINE.map(lambda p: p * 1.05 / size)), 50.01, atol=1e-9)


def test_a_line_that_is_not_reciprocal() -> None:
    """S12 + 0.05: reciprocity 50.001 %, passivity 91.4175 %."""
    bent = TwoPort(LINE.s11, LINE.s12 + 0.05, LINE.s21, LINE.s22)
    assert_allclose(reciprocity_percent(bent), 50.001, atol=1e-9)
    assert_allclose(passivity_percent(bent), 91.4175, atol=1e-4)


def test_data_that_turn_the_wrong_way() -> None:
    assert_allclose(causality_percent(LINE.map(np.conj)), 0.0, atol=0.03)


@pytest.mark.parametrize("seed", range(3))
def test_scikit_rf_agrees_on_noise(seed: int) -> None:
    g = np.random.default_rng(seed)
    noisy = TwoPort(
        *(p + 0.02 * (g.standard_normal(2000) + 1j * g.standard_normal(2000)) for p in LINE.planes)
    )
    network = skrf.Network(frequency=skrf.Frequency.from_f(F_HZ, unit="hz"), s=noisy.matrix)
    theirs = IEEEP370_FD_QM().check_se_quality(network)
    mine = quality(noisy)
    for name in ("causality", "passivity", "reciprocity"):
        assert_allclose(getattr(mine, name), theirs[name]["value"], atol=1e-9)
        assert mine.grades[name] == theirs[name]["evaluation"]


def test_the_greatest_gain_is_the_two_norm() -> None:
    g = np.random.default_rng(1)
    m = g.standard_normal((50, 2, 2)) + 1j * g.standard_normal((50, 2, 2))
    assert_allclose(largest_gain(TwoPort.of(m)), np.linalg.norm(m, 2, axis=(1, 2)), rtol=1e-12)


def test_a_constant_trace_counts_as_causal() -> None:
    flat = np.full(2000, 0.5 + 0j)
    assert causality_percent(TwoPort(flat, LINE.s12, LINE.s21, flat)) == pytest.approx(
        causality_percent(TwoPort(LINE.s21, LINE.s12, LINE.s21, LINE.s21))
    )


@pytest.mark.parametrize(
    ("value", "causal", "other"),
    [(99.95, "good", "good"), (99.5, "good", "acceptable"), (81.0, "good", "inconclusive"),
     (80.0, "acceptable", "poor"), (50.0, "inconclusive", "poor"), (20.0, "poor", "poor")],
)  # fmt: skip
def test_grades_at_their_limits(value: float, causal: str, other: str) -> None:
    found = Quality(value, value, value)
    assert found.grades == {"causality": causal, "passivity": other, "reciprocity": other}
    assert found.worst == other


@pytest.mark.parametrize(
    ("insertion", "reflection", "distance", "letters"),
    [
        (-10.0, -20.0, 5.0, "AAA"),
        (-10.1, -19.9, 4.9, "BBB"),
        (-15.0, -10.0, 0.0, "BBB"),
        (-15.0, -9.9, 0.0, "BCB"),
        (-14.0, -6.0, 3.0, "BCB"),
    ],
)
def test_classes_at_their_limits(insertion: float, reflection: float, distance: float, letters: str) -> None:
    found = FixtureClass(insertion, reflection, distance)
    assert "".join(found.classes.values()) == letters
    assert found.letter == max(letters)


@pytest.mark.parametrize("bad", [(-15.1, -20.0, 5.0), (-10.0, -5.9, 5.0), (-10.0, -20.0, -0.1)])
def test_beyond_class_c_there_is_none(bad: tuple[float, float, float]) -> None:
    assert FixtureClass(*bad).letter == "none"


def test_the_class_of_a_line() -> None:
    found = fixture_class(LINE)
    assert_allclose(found.insertion_db, 20 * np.log10(np.abs(LINE.s21)).min(), atol=1e-9)
    assert_allclose(found.reflection_db, 20 * np.log10(np.abs(LINE.s11)).max(), atol=1e-9)
    assert found.classes == {"insertion loss": "A", "return loss": "A", "loss over reflection": "A"}


@pytest.mark.parametrize(
    ("off", "letter"), [(0.025, "A"), (0.03, "B"), (0.05, "B"), (0.1, "C"), (0.11, "none")]
)
def test_the_class_of_an_impedance_along_the_line(off: float, letter: str) -> None:
    reference = np.full(10, 50.0)
    fixture = reference.copy()
    fixture[4] *= 1 - off + 1e-12
    assert impedance_class(reference, fixture) == letter
