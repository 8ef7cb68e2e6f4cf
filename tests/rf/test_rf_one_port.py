"""Short, open and load: three terms, found again, refused where the readings cannot tell them."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.calibration.one_port import REFLECTIONS, ShortOpenLoad, own_reflection, solve_three
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(40e6, 6e9, 11)
KIT = Kit(
    "made up",
    {
        "short": Standard("short", Offset(31e-12, 2.1e9), inductance=(2e-12, 0, 0, 0)),
        "open": Standard("open", Offset(29e-12, 2.1e9), capacitance=(50e-15, 0, 0, 0)),
        "load": Standard("load", Offset(30e-12, 2.1e9, 50.1), resistance_ohm=49.8),
    },
)


def seen_on(port: int, plane: np.ndarray) -> TwoPort:
    """A two-port reading whose other port saw something else altogether."""
    other, zero = np.full(plane.shape, 0.123 + 0.4j), np.zeros(plane.shape, complex)
    return TwoPort(plane, zero, zero, other) if port == 1 else TwoPort(other, zero, zero, plane)


def readings_of(terms: OnePortTerms, port: int) -> dict[str, TwoPort]:
    truths = define(KIT, REFLECTIONS, F_HZ)
    return {Hookup.of(n, port).text: seen_on(port, terms.embed(np.asarray(truths[n]))) for n in REFLECTIONS}


@pytest.mark.parametrize("port", [1, 2])
@pytest.mark.parametrize("seed", range(15))
def test_the_terms_are_found_again(seed: int, port: int, random_terms) -> None:
    truth = random_terms(seed).forward.port
    found = ShortOpenLoad().solve((port,), define(KIT, REFLECTIONS, F_HZ), readings_of(truth, port))
    assert_allclose(found.directivity, truth.directivity, atol=1e-13)
    assert_allclose(found.source_match, truth.source_match, atol=1e-12)
    assert_allclose(found.tracking, truth.tracking, atol=1e-12)


@pytest.mark.parametrize("port", [1, 2])
@pytest.mark.parametrize("seed", range(5))
def test_correction_agrees_with_scikit_rf(seed: int, port: int, random_terms, random_device) -> None:
    """Against scikit-rf's ``OnePort``, a least-squares solver: within the run's own limit of 1e-9."""
    truth, device = random_terms(seed).forward.port, random_device(seed).s11
    method, readings = METHODS["SOL"], readings_of(truth, port)
    raw = seen_on(port, truth.embed(device))
    solved = method.solve((port,), define(KIT, REFLECTIONS, F_HZ), readings)
    assert isinstance(solved, OnePortTerms)
    mine = solved.correct(own_reflection(raw, port))
    assert_allclose(mine, device, atol=1e-11)
    assert differ(mine, method.examiner(F_HZ, (port,), KIT, readings)(raw)) < 1e-11


def test_ideal_standards_give_the_textbook_terms() -> None:
    """With +1, -1, 0: eD is the load's reading and eS = (Mo + Ms - 2 eD)/(Mo - Ms), from memory."""
    mo, ms, ml = (np.array([v]) for v in (0.9 - 0.2j, -0.95 + 0.1j, 0.03 + 0.01j))
    unit = np.array([1.0 + 0j])
    found = solve_three([-unit, unit, 0 * unit], [ms, mo, ml], "port 1")
    match = (mo + ms - 2 * ml) / (mo - ms)
    assert_allclose(found.directivity, ml, atol=1e-16)
    assert_allclose(found.source_match, match, atol=1e-15)
    assert_allclose(found.tracking, (mo - ml) * (1 - match), atol=1e-15)


def test_the_order_of_standards_does_not_matter(random_terms) -> None:
    truth = random_terms(1).forward.port
    truths = [np.asarray(define(KIT, (n,), F_HZ)[n]) for n in REFLECTIONS]
    seen = [truth.embed(s) for s in truths]
    turned = solve_three(truths[::-1], seen[::-1], "port 1")
    assert_allclose(turned.tracking, solve_three(truths, seen, "port 1").tracking, atol=1e-12)


@pytest.mark.parametrize("alike", [("short", "open"), ("open", "load"), ("short", "load")])
def test_the_same_standard_read_twice_is_refused(alike, random_terms) -> None:
    """A hand that left the short on while the open was asked for."""
    readings = readings_of(random_terms(2).forward.port, 1)
    first, second = (Hookup.of(n, 1).text for n in alike)
    readings[second] = readings[first]
    with pytest.raises(InvalidMeasurement, match=r"on port 1 differ by only 0\.0e\+00") as caught:
        ShortOpenLoad().solve((1,), define(KIT, REFLECTIONS, F_HZ), readings)
    assert "read the three again" in caught.value.advice


def test_standards_alike_at_one_point_only_are_refused(random_terms) -> None:
    """One frequency at which two agree is enough to make the terms there worthless."""
    readings = readings_of(random_terms(2).forward.port, 1)
    bent = readings["open on port 1"].s11.copy()
    bent[4] = readings["short on port 1"].s11[4] + 5e-4
    readings["open on port 1"] = seen_on(1, bent)
    with pytest.raises(InvalidMeasurement, match=r"5\.0e-04"):
        ShortOpenLoad().solve((1,), define(KIT, REFLECTIONS, F_HZ), readings)


@pytest.mark.parametrize("name", REFLECTIONS)
@pytest.mark.parametrize("value", [np.nan, np.inf])
def test_a_missing_number_in_any_standard_is_refused(name: str, value: float, random_terms) -> None:
    readings = readings_of(random_terms(2).forward.port, 2)
    bent = readings[f"{name} on port 2"].s22.copy()
    bent[3] = value
    readings[f"{name} on port 2"] = seen_on(2, bent)
    with pytest.raises(InvalidMeasurement, match="on port 2 holds a value that is not a number"):
        ShortOpenLoad().solve((2,), define(KIT, REFLECTIONS, F_HZ), readings)


def test_short_and_open_exchanged_show_as_a_turned_device(random_terms) -> None:
    """Not an error of the readings; every reflection then comes out with about the opposite sign."""
    truth = random_terms(3).forward.port
    readings = readings_of(truth, 1)
    names = ("short on port 1", "open on port 1")
    readings[names[0]], readings[names[1]] = readings[names[1]], readings[names[0]]
    solved = ShortOpenLoad().solve((1,), define(KIT, REFLECTIONS, F_HZ), readings)
    truth_short = KIT.standards["short"].reflection(F_HZ)
    assert_allclose(
        solved.correct(truth.embed(truth_short)), KIT.standards["open"].reflection(F_HZ), atol=1e-9
    )


def test_what_must_be_connected() -> None:
    texts = [h.text for h in ShortOpenLoad().required((2,))]
    assert texts == ["short on port 2", "open on port 2", "load on port 2"]


def test_draws_of_definitions_give_draws_of_terms(random_terms) -> None:
    """Each row of moved definitions is solved as if it stood alone."""
    readings = readings_of(random_terms(4).forward.port, 1)
    moved = define(KIT, REFLECTIONS, F_HZ, {"load": {"resistance_ohm": np.array([[0.0], [0.2]])}})
    found = ShortOpenLoad().solve((1,), moved, readings)
    assert found.directivity.shape == (2, 11)
    alone = ShortOpenLoad().solve(
        (1,), define(KIT, REFLECTIONS, F_HZ, {"load": {"resistance_ohm": 0.2}}), readings
    )
    assert_allclose(found.directivity[1], alone.directivity, atol=1e-15)


def test_a_difference_never_hides_a_missing_number() -> None:
    """What compares with the second implementation must not call nan an agreement."""
    plane, hole = np.zeros(2, complex), np.array([0.0, np.nan + 0j])
    assert differ(plane, plane + 0.25) == 0.25
    assert np.isnan(differ(plane, hole))
    whole = TwoPort(plane, plane, plane, plane)
    for k in range(4):
        planes = [hole if i == k else plane for i in range(4)]
        assert np.isnan(differ(whole, TwoPort(*planes)))
