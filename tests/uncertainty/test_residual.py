"""Residual terms: worked numbers, agreement of formula and error box, and what a bench file may say.

First-order forms after EA-10/12 (from memory); worked numbers computed from them apart from this project.
"""

from __future__ import annotations

import math
from dataclasses import fields, replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from benchrun.quantity import QuantityError
from benchrun.rf.twoport import TwoPort
from benchrun.uncertainty.residual import DECIBEL_LOSS, DECIBEL_RIPPLE, ResidualTerms

WORKED = ResidualTerms(directivity=0.0100, reflection_tracking=0.005, source_match=0.0126, load_match=0.0126)
ALL = ResidualTerms(0.004, 0.005, 0.006, 0.003, 0.002, 0.0007, 0.001, 0.0002, 0.0005)
NO_NOISE = replace(ALL, noise_floor=0.0, trace_noise=0.0)


def device(s11: complex, s21: complex, s22: complex = 0.0, s12: complex | None = None) -> TwoPort:
    return TwoPort(*(np.array([v], complex) for v in (s11, s21 if s12 is None else s12, s21, s22)))


def no_draws(points: int = 1) -> TwoPort:
    empty = np.empty((0, points), complex)
    return TwoPort(empty, empty, empty, empty)


def spread(rows: np.ndarray, nominal: np.ndarray) -> np.ndarray:
    """Standard uncertainty of the real part from one-at-a-time steps: root of the sum of squares."""
    return np.sqrt(np.sum((rows - nominal).real ** 2, axis=0))


WORKED_NUMBERS = [  # |S11|, |S21 S12|, worst case, root sum of squares
    (0.1, 0.0, 0.010626, 0.010013),
    (0.1, 0.25, 0.013776, 0.010497),
    (0.9, 0.0, 0.024706, 0.014980),
    (0.0316, 0.9801, 0.022520, 0.015891),
]


@pytest.mark.parametrize(("s11", "loop", "worst_case", "rss"), WORKED_NUMBERS)
def test_the_worked_numbers(s11: float, loop: float, worst_case: float, rss: float) -> None:
    """Magnitudes over the square root of two per axis: the formula times sqrt 2 is the printed RSS."""
    s = device(s11, math.sqrt(loop))
    u11, _ = WORKED.first_order(s)
    assert_allclose(u11 * math.sqrt(2), rss, atol=6e-7)
    # The worst case is all terms in phase; from the error box, real steps alone.
    rows = WORKED.vary(s, no_draws())
    assert isinstance(rows, TwoPort)
    steps = np.abs(rows.s11 - s.s11)[:, 0].reshape(-1, 2)[:, 0] * math.sqrt(2)
    # Finite steps differ from first order by their square: below 1 % of the sum here.
    assert_allclose(steps.sum(), worst_case, rtol=0.01)


@pytest.mark.parametrize(
    "s",
    [
        device(0.1, 0.9, 0.1),
        device(0.9j, 0.0),
        device(0.3 - 0.2j, 0.5 + 0.4j, -0.6j, 0.1),
        device(-0.7, 1e-4, 0.8j),
        device(0.0, 3.0, 0.2, 0.05),
    ],
    ids=["low loss", "reflect", "uneven", "stop band", "amplifier"],
)
def test_formula_and_error_box_agree(s: TwoPort) -> None:
    """The stepped twelve-term box is the formula up to second order in the residuals (a few 1e-3)."""
    u11, u21 = NO_NOISE.first_order(s)
    rows = NO_NOISE.vary(s, no_draws())
    assert isinstance(rows, TwoPort)
    assert_allclose(spread(rows.s11, s.s11), u11, rtol=0.02, atol=1e-9)
    assert_allclose(spread(rows.s21, s.s21), u21, rtol=0.02, atol=1e-9)


@pytest.mark.parametrize("term", [f.name for f in fields(ResidualTerms) if "nois" not in f.name])
def test_each_term_alone_agrees(term: str) -> None:
    """So that no term hides behind a larger one; noise has its own test."""
    s = device(0.3 - 0.2j, 0.5 + 0.4j, -0.6j, 0.1)
    alone = ResidualTerms(**{term: 0.001})
    rows = alone.vary(s, no_draws())
    assert isinstance(rows, TwoPort)
    u11, u21 = alone.first_order(s)
    assert_allclose(spread(rows.s11, s.s11), u11, rtol=2e-3, atol=1e-12)
    assert_allclose(spread(rows.s21, s.s21), u21, rtol=2e-3, atol=1e-12)


def test_the_linearised_remainder_is_small() -> None:
    """At residuals of 1e-3 the linear form leaves less than the square of a step, 5e-7."""
    s = device(0.5 + 0.3j, 0.6 - 0.2j, -0.4 + 0.4j)
    size = 1e-3
    terms = ResidualTerms(size, size, size, size, size)
    rows = terms.vary(s, no_draws())
    assert isinstance(rows, TwoPort)
    a, loop, step = s.s11[0], s.s21[0] * s.s12[0], size / math.sqrt(2)
    linear = {
        "directivity": 1.0, "tracking": a, "source match": a**2, "load match": loop, "transmission": 0.0,
        "isolation": 0.0, "repeatability": 0.0,
    }  # fmt: skip
    for row, name in enumerate(terms.names):
        term, way, axis = name.split(", ")
        wanted = linear[term] * step * (1j if axis == "im" else 1) if way == "forward" else 0.0
        assert abs(rows.s11[row, 0] - a - wanted) < step**2, name


def test_each_row_steps_what_its_name_says() -> None:
    """Forward terms move S11 and S21, reverse terms S22 and S12; a connection is seen from both sides."""
    s = device(0.3, 0.5, 0.4, 0.6)
    terms = ResidualTerms(0.01, 0.01, 0.01, 0.01, 0.01, 0.01, 0.01)
    rows = terms.vary(s, no_draws())
    assert isinstance(rows, TwoPort)
    assert rows.s11.shape == (terms.steps, 1)
    assert len(terms.names) == len(set(terms.names)) == terms.steps == 28
    for row, name in enumerate(terms.names):
        moved = {
            n
            for n in ("S11", "S21", "S12", "S22")
            if abs((rows.parameter(n) - s.parameter(n))[row, 0]) > 1e-12
        }
        term, way, _ = name.split(", ")
        near, through = ("S11", "S21") if way == "forward" else ("S22", "S12")
        wanted = {
            "directivity": {near}, "source match": {near, through}, "tracking": {near},
            "load match": {near, through}, "transmission": {through}, "isolation": {through},
            "repeatability": {"S11", "S21", "S12", "S22"},
        }[term]  # fmt: skip
        assert moved == wanted, name


def test_a_turned_device_has_turned_uncertainties() -> None:
    """Both ports carry the same residuals, so forward and reverse are mirror images."""
    s = device(0.3 - 0.2j, 0.5 + 0.4j, -0.6j, 0.1)
    rows, turned = NO_NOISE.vary(s, no_draws()), NO_NOISE.vary(s.flipped(), no_draws())
    assert isinstance(rows, TwoPort)
    assert isinstance(turned, TwoPort)
    assert_allclose(spread(rows.s22, s.s22), spread(turned.s11, s.s22), rtol=1e-12)
    assert_allclose(spread(rows.s12, s.s12), spread(turned.s21, s.s12), rtol=1e-12)


def test_a_residual_is_one_number_for_the_whole_sweep() -> None:
    """A systematic error does not average out along it: the same step stands at every point."""
    s = TwoPort(*(np.zeros(5, complex),) * 4)
    rows = ResidualTerms(directivity=0.01).vary(s, no_draws(5))
    assert isinstance(rows, TwoPort)
    assert_array_equal(rows.s11, np.broadcast_to(rows.s11[:, :1], rows.s11.shape))


def test_noise_is_drawn_anew_at_each_point_and_reading() -> None:
    """Floor and trace noise add: sd per axis = (floor + trace |S|)/sqrt 2, the formula's last term."""
    g, n, f = np.random.default_rng(11), 4000, 3
    s = TwoPort(*(np.array([v, v, v], complex) for v in (0.1, 0.5, 0.8, 0.2)))
    draws = TwoPort(
        *((g.standard_normal((n, f)) + 1j * g.standard_normal((n, f))) / math.sqrt(2) for _ in range(4))
    )
    noisy = ResidualTerms(noise_floor=0.002, trace_noise=0.01)
    rows = noisy.vary(s, draws)
    assert isinstance(rows, TwoPort)
    u11, u21 = noisy.first_order(s)
    sample = rows.s21[noisy.steps :]
    assert sample.shape == (n, f)
    # 4000 draws know a standard deviation to 1.1 %; four of these.
    assert_allclose(sample.real.std(axis=0), u21, rtol=0.045)
    assert_allclose(rows.s11[noisy.steps :].imag.std(axis=0), u11, rtol=0.045)
    assert abs(np.corrcoef(sample[:, 0].real, sample[:, 1].real)[0, 1]) < 0.08


def test_without_terms_nothing_moves() -> None:
    s = device(0.3, 0.5, 0.4, 0.6)
    none = ResidualTerms()
    rows = none.vary(s, no_draws())
    assert isinstance(rows, TwoPort)
    assert not none.declared
    assert_allclose(rows.s11, np.full((28, 1), 0.3), atol=1e-16)
    assert_allclose(none.first_order(s), 0.0, atol=0)


@pytest.mark.parametrize("term", [f.name for f in fields(ResidualTerms)])
def test_any_one_term_counts_as_declared(term: str) -> None:
    assert ResidualTerms(**{term: 1e-6}).declared


@pytest.mark.parametrize("s11", [0.0, 0.1, 0.9j, -0.7 + 0.2j])
def test_one_port_steps_are_those_of_a_two_port_that_passes_nothing(s11: complex) -> None:
    """The same bench, the same doubt, whichever calibration was used."""
    plane = np.array([s11], complex)
    alone = NO_NOISE.vary(plane, np.empty((0, 1), complex))
    assert not isinstance(alone, TwoPort)
    assert alone.shape == (ResidualTerms.one_port_steps, 1)
    rows = NO_NOISE.vary(device(s11, 0.0), no_draws())
    assert isinstance(rows, TwoPort)
    assert_allclose(spread(alone, plane), spread(rows.s11, plane), rtol=1e-12)


def test_one_port_noise_follows_its_steps() -> None:
    plane, draws = np.array([0.5, 0.1], complex), np.array([[1.0, 1j], [-1.0, 2.0]], complex)
    rows = ResidualTerms(noise_floor=0.01, trace_noise=0.1).vary(plane, draws)
    assert not isinstance(rows, TwoPort)
    assert_allclose(rows[8:], [[0.56, 0.1 + 0.02j], [0.44, 0.14]], atol=1e-15)


@pytest.mark.parametrize("name", DECIBEL_LOSS)
@pytest.mark.parametrize(("text", "linear"), [("40 dB", 0.01), ("-40 dB", 0.01), ("46 dB", 0.0050119)])
def test_a_level_below_one(name: str, text: str, linear: float) -> None:
    """Directivity of 40 dB is a magnitude of 0.01, written with or without its sign."""
    terms = ResidualTerms.from_mapping({name: text})
    assert getattr(terms, name.replace(" ", "_")) == pytest.approx(linear, rel=1e-5)


@pytest.mark.parametrize("name", DECIBEL_RIPPLE)
@pytest.mark.parametrize(("text", "linear"), [("0.03 dB", 0.00345985), ("0 dB", 0.0), ("-0.1 dB", 0.0115795)])
def test_a_deviation_from_one(name: str, text: str, linear: float) -> None:
    """10^(0.03/20) - 1 = 0.00346."""
    terms = ResidualTerms.from_mapping({name: text})
    assert getattr(terms, name.replace(" ", "_")) == pytest.approx(linear, rel=1e-5)


def test_every_term_can_be_declared() -> None:
    """The words of a bench file and the fields are the same set."""
    words = {name.replace(" ", "_") for name in DECIBEL_LOSS + DECIBEL_RIPPLE}
    assert words == {f.name for f in fields(ResidualTerms)}


@pytest.mark.parametrize(
    ("declared", "words"),
    [
        ({"directivity": "40"}, "has no unit"),
        ({"directivity": 40}, "has no unit"),
        ({"directivity": "40 dBm"}, "is not in dB"),
        ({"directivty": "40 dB"}, "'directivty' is no residual term; known are directivity, source match"),
        ({"source_match": "40 dB"}, "is no residual term"),
        ({"trace noise": "0.1 %"}, "is not in dB"),
    ],
)
def test_a_wrong_declaration_is_refused_in_words(declared: dict[str, str], words: str) -> None:
    with pytest.raises(QuantityError, match=words):
        ResidualTerms.from_mapping(declared)
