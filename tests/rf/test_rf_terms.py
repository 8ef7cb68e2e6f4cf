"""Error terms: the published model, its inverse, and its agreement with other people's code."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from skrf.calibration import TwelveTerm

from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms
from benchrun.rf.twoport import TwoPort


def one(*values: complex) -> tuple[np.ndarray, ...]:
    return tuple(np.array([v], complex) for v in values)


VECTOR = TwelveTerms(
    Direction(*one(0.05 - 0.02j, 0.1 + 0.05j, 0.95 + 0.02j, 0.08 - 0.06j, 0.97 - 0.03j, 1e-4 + 2e-4j)),
    Direction(*one(-0.04 + 0.03j, 0.07 - 0.09j, 0.93 - 0.05j, 0.09 + 0.04j, 0.96 + 0.04j, -1e-4 + 1e-4j)),
)
"""Computed once with scikit-rf 2.2.0's ``TwelveTerm`` (Rehnmark, IEEE Trans. MTT-22, 1974)."""
TRUE = TwoPort(*one(0.2 + 0.1j, 0.6 - 0.3j, 0.5 - 0.4j, -0.15 + 0.25j))
RAW = TwoPort(*one(0.233479 + 0.042450j, 0.614311 - 0.244127j, 0.500014 - 0.388548j, -0.144728 + 0.242343j))


def test_the_check_vector_is_embedded() -> None:
    """To the six decimals in which the reading was noted."""
    assert_allclose(VECTOR.embed(TRUE).matrix, RAW.matrix, atol=1e-6)


def test_the_check_vector_is_corrected() -> None:
    """Six decimals of reading give six of truth, at error terms near one."""
    assert_allclose(VECTOR.correct(RAW).matrix, TRUE.matrix, atol=2e-6)


def test_the_check_vector_goes_round() -> None:
    assert_allclose(VECTOR.correct(VECTOR.embed(TRUE)).matrix, TRUE.matrix, atol=1e-15)


def skrf_terms(terms: TwelveTerms) -> dict[str, np.ndarray]:
    names = {
        "directivity": "directivity",
        "source match": "source_match",
        "reflection tracking": "tracking",
        "load match": "load_match",
        "transmission tracking": "transmission",
        "isolation": "isolation",
    }
    return {
        f"{way} {theirs}": getattr(getattr(terms, way), ours)
        for way in ("forward", "reverse")
        for theirs, ours in names.items()
    }


@pytest.mark.parametrize("seed", range(10))
def test_embedding_and_correcting_are_scikit_rfs(seed: int, random_terms, random_device) -> None:
    """Against ``TwelveTerm.embed`` and ``apply_cal``, to rounding."""
    terms, device = random_terms(seed, isolation=0.01), random_device(seed)
    frequency = skrf.Frequency(1, 2, 11, "GHz")
    theirs = TwelveTerm.from_coefs(frequency, skrf_terms(terms), n_thrus=1)
    raw = terms.embed(device)
    network = skrf.Network(frequency=frequency, s=device.matrix)
    assert_allclose(raw.matrix, theirs.embed(network).s, atol=1e-13)
    corrected = theirs.apply_cal(skrf.Network(frequency=frequency, s=raw.matrix))
    assert_allclose(terms.correct(raw).matrix, corrected.s, atol=1e-12)


@pytest.mark.parametrize("seed", range(20))
def test_correction_undoes_embedding(seed: int, random_terms, random_device) -> None:
    terms, device = random_terms(seed, isolation=0.01), random_device(seed)
    assert_allclose(terms.correct(terms.embed(device)).matrix, device.matrix, atol=1e-12)


def test_turning_analyzer_and_device_round_turns_the_reading_round(random_terms, random_device) -> None:
    """The forward and the reverse half of the model are mirror images."""
    terms, device = random_terms(3, isolation=0.01), random_device(3)
    turned = TwelveTerms(terms.reverse, terms.forward)
    assert_allclose(turned.embed(device.flipped()).flipped().matrix, terms.embed(device).matrix, atol=1e-15)
    raw = terms.embed(device)
    assert_allclose(turned.correct(raw.flipped()).flipped().matrix, device.matrix, atol=1e-13)


def test_a_deep_stop_band_survives_correction(random_terms) -> None:
    """S21 = 1e-10 comes back to 1e-12 relative, with no leakage in the analyzer."""
    terms = random_terms(5)
    small = np.full(11, 1e-10 + 0j)
    device = TwoPort(np.full(11, 0.6 + 0.5j), small, small * 2, np.full(11, -0.7 + 0.2j))
    back = terms.correct(terms.embed(device))
    assert_allclose(back.s21, device.s21, rtol=1e-12)
    assert_allclose(back.s12, device.s12, rtol=1e-12)


def test_isolation_is_added_to_transmission_only() -> None:
    """What leaks past the device appears where nothing passes it."""
    zero = np.zeros(1, complex)
    nothing = TwoPort(zero, zero, zero, zero)
    raw = VECTOR.embed(nothing)
    assert raw.s21[0] == 1e-4 + 2e-4j
    assert raw.s12[0] == -1e-4 + 1e-4j
    assert raw.s11[0] == 0.05 - 0.02j


def test_the_reflection_terms_of_a_direction_are_its_one_port(random_terms) -> None:
    """With nothing passing the device, two ports are one port twice."""
    forward = random_terms(6).forward
    s = np.full(11, 0.3 - 0.8j)
    zero = np.zeros(11, complex)
    two = TwelveTerms(forward, forward).embed(TwoPort(s, zero, zero, zero))
    assert_allclose(forward.port.embed(s), two.s11, atol=1e-15)


part = st.floats(-1.0, 1.0)
small = st.builds(lambda r, i: 0.2 * complex(r, i), part, part)
any_s = st.builds(lambda r, i: 0.7 * complex(r, i), part, part)


@settings(deadline=None, max_examples=100)
@given(small, small, small, any_s)
def test_one_port_correction_undoes_embedding(directivity, match, tracking_error, s) -> None:
    """M = eD + eR S / (1 - eS S) and back, for any well-behaved port."""
    terms = OnePortTerms(*one(directivity, match, 1.0 + tracking_error))
    assert_allclose(terms.correct(terms.embed(np.array([s]))), [s], atol=1e-13)


def test_ideal_terms_change_nothing() -> None:
    zero, unity = one(0.0, 1.0)
    ideal = Direction(zero, zero, unity, zero, unity)
    assert_allclose(TwelveTerms(ideal, ideal).embed(TRUE).matrix, TRUE.matrix, atol=0)


def test_draws_of_terms_broadcast_over_one_reading(random_terms, random_device) -> None:
    """Draws (d, 1) times points (f,): each row is the row that stands alone."""
    device = random_device(2)
    steps = np.linspace(0, 0.1, 5)[:, None] + 0j
    zero, unity = np.zeros(11, complex), np.ones(11, complex)
    drawn = Direction(steps, zero, unity, zero, unity)
    alone = Direction(steps[3], zero, unity, zero, unity)
    plain = random_terms(2).reverse
    many = TwelveTerms(drawn, plain).correct(device)
    assert many.s11.shape == (5, 11)
    assert_allclose(many.s11[3], TwelveTerms(alone, plain).correct(device).s11, atol=0)
