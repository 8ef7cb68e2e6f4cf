"""The eight-term model: there and back, against scikit-rf, and its free self-check."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose
from skrf.calibration import convert_8term_2_12term, convert_12term_2_8term, terminate, unterminate

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.eight_terms import EightTerms, k_disagreement, k_estimates
from benchrun.rf.calibration.switch_terms import NO_SWITCH, SWITCH_READING, SwitchTerms
from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms
from benchrun.rf.twoport import TwoPort

POINTS = 9
FREQUENCY = skrf.Frequency(1, 2, POINTS, "GHz")
NAMES = {
    "directivity": "directivity",
    "source_match": "source match",
    "tracking": "reflection tracking",
    "load_match": "load match",
    "transmission": "transmission tracking",
}


def disk(g: np.random.Generator, radius: float) -> np.ndarray:
    return g.uniform(0, radius, POINTS) * np.exp(2j * np.pi * g.uniform(size=POINTS))


def some(seed: int, switch: bool = True) -> EightTerms:
    g = np.random.default_rng(seed)
    one, two = (OnePortTerms(disk(g, 0.2), disk(g, 0.3), 0.5 + disk(g, 0.3)) for _ in (1, 2))
    idle = SwitchTerms(disk(g, 0.3), disk(g, 0.3)) if switch else NO_SWITCH
    return EightTerms(one, two, 1.0 + disk(g, 0.3), idle)


def as_skrf(terms: TwelveTerms) -> dict[str, np.ndarray]:
    return {
        f"{way} {theirs}": getattr(getattr(terms, way), ours)
        for way in ("forward", "reverse")
        for ours, theirs in NAMES.items()
    } | {"forward isolation": np.zeros(POINTS), "reverse isolation": np.zeros(POINTS)}


@pytest.mark.parametrize("switch", [True, False])
@pytest.mark.parametrize("seed", range(5))
def test_eight_to_twelve_as_scikit_rf_does_it(seed: int, switch: bool) -> None:
    """Source: Marks 1997; also at zero switch terms, where scikit-rf's form divides nothing by nothing."""
    eight = some(seed, switch)
    zero = np.zeros(POINTS, complex)
    coefficients = {
        "forward directivity": eight.one.directivity,
        "forward source match": eight.one.source_match,
        "forward reflection tracking": eight.one.tracking,
        "reverse directivity": eight.two.directivity,
        "reverse source match": eight.two.source_match,
        "reverse reflection tracking": eight.two.tracking,
        "forward switch term": eight.switch.forward + zero,
        "reverse switch term": eight.switch.reverse + zero,
        "k": eight.k,
        "forward isolation": zero,
        "reverse isolation": zero,
    }
    theirs, mine = convert_8term_2_12term(coefficients), as_skrf(eight.twelve())
    for name, value in mine.items():
        assert_allclose(value, theirs[name], atol=1e-14, err_msg=name)


@pytest.mark.parametrize("seed", range(5))
def test_twelve_to_eight_as_scikit_rf_does_it(seed: int) -> None:
    eight = some(seed)
    theirs = convert_12term_2_8term(as_skrf(eight.twelve()))
    back = EightTerms.of(eight.twelve())
    assert_allclose(back.switch.forward, theirs["forward switch term"], atol=1e-14)
    assert_allclose(back.switch.reverse, theirs["reverse switch term"], atol=1e-14)
    assert_allclose(back.k, theirs["k"], atol=1e-14)
    assert_allclose(back.k, eight.k, atol=1e-14)
    assert_allclose(back.two.tracking, eight.two.tracking, atol=0)


@pytest.mark.parametrize("seed", range(5))
def test_termination_as_scikit_rf_does_it(seed: int) -> None:
    g = np.random.default_rng(seed)
    switch, m = SwitchTerms(disk(g, 0.4), disk(g, 0.4)), TwoPort(*(disk(g, 0.9) for _ in range(4)))
    network = skrf.Network(frequency=FREQUENCY, s=m.matrix)
    gf, gr = (skrf.Network(frequency=FREQUENCY, s=x[:, None, None]) for x in (switch.forward, switch.reverse))
    assert_allclose(switch.unterminate(m).matrix, unterminate(network, gf, gr).s, atol=1e-14)
    assert_allclose(switch.terminate(m).matrix, terminate(network, gf, gr).s, atol=1e-14)
    assert_allclose(switch.terminate(switch.unterminate(m)).matrix, m.matrix, atol=1e-13)


def test_without_switch_terms_a_reading_stays_as_it_is() -> None:
    m = TwoPort(*(np.ones(POINTS, complex) for _ in range(4)))
    assert NO_SWITCH.unterminate(m) is m
    assert NO_SWITCH.terminate(m) is m
    assert SwitchTerms.among({}).absent


def test_switch_terms_stand_among_the_readings() -> None:
    """Forward in s21, reverse in s12: what an analyzer reads in its thru."""
    g = np.random.default_rng(1)
    switch = SwitchTerms(disk(g, 0.3), disk(g, 0.3))
    again = SwitchTerms.among({SWITCH_READING: switch.reading})
    assert_allclose(again.forward, switch.forward, atol=0)
    assert_allclose(again.reverse, switch.reverse, atol=0)
    assert not again.absent


@pytest.mark.parametrize("value", [1.2, np.nan])
def test_an_idle_port_that_gives_more_than_it_gets_is_refused(value: float) -> None:
    reading = SwitchTerms(np.full(POINTS, 0.1 + 0j), np.full(POINTS, value + 0j)).reading
    with pytest.raises(InvalidMeasurement, match="an idle port reflects less than it gets") as caught:
        SwitchTerms.among({SWITCH_READING: reading})
    assert "switch terms again" in caught.value.advice


def test_k_is_the_same_twice_over_for_one_pair_of_boxes() -> None:
    forward, reverse = k_estimates(some(3).twelve())
    assert_allclose(forward, reverse, atol=1e-14)
    assert_allclose(k_disagreement(some(3).twelve()), 0.0, atol=1e-14)


def test_a_thru_that_is_not_reciprocal_shows_in_k() -> None:
    """5 % more one way than the other: the estimates differ by 5 %, whatever the boxes are."""
    terms = some(3).twelve()
    f = terms.forward
    more = Direction(f.directivity, f.source_match, f.tracking, f.load_match, 1.05 * f.transmission)
    assert_allclose(k_disagreement(TwelveTerms(more, terms.reverse)), 0.05, atol=1e-13)


@pytest.mark.parametrize("z_old", [75.0, 30.0 + 5.0j])
def test_renormalised_terms_give_renormalised_results(z_old: complex) -> None:
    """Against scikit-rf's pseudo-wave renormalisation of the corrected device, real and complex."""
    eight, g = some(4), np.random.default_rng(9)
    raw = eight.embed(TwoPort(*(disk(g, 0.8) for _ in range(4))))
    network = skrf.Network(frequency=FREQUENCY, s=eight.correct(raw).matrix, z0=z_old, s_def="pseudo")
    network.renormalize(50.0, s_def="pseudo")
    mine = eight.renormalised((z_old - 50.0) / (z_old + 50.0)).correct(raw)
    assert_allclose(mine.matrix, network.s, atol=1e-13)
