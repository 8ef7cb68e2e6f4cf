"""E_n numbers, the control chart and the ripple technique."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.uncertainty.control_chart import Chart, State, baseline, judge
from benchrun.uncertainty.ripple import LIGHT, effective_terms, half_ripple, least_length_m
from benchrun.uncertainty.verification import FACTOR_2D, en_complex, en_number, verify

F_HZ = np.linspace(1e9, 5e9, 401)


def test_en_number_of_a_worked_pair():
    # ISO/IEC 17043 form: difference over the root sum of squares of both expanded uncertainties.
    assert en_number(np.array([5.3, 5.0]), 5.0, 0.3, 0.4) == pytest.approx([0.6, 0.0])


def test_en_in_the_plane_is_left_by_one_in_twenty():
    generator = np.random.default_rng(11)
    covariance = np.broadcast_to(np.array([[4.0, 1.0], [1.0, 1.0]]) * 1e-6, (50_000, 2, 2))
    known = np.broadcast_to(np.eye(2) * 1e-6, (50_000, 2, 2))
    off = generator.multivariate_normal([0, 0], covariance[0] + known[0], 50_000)
    en = en_complex(off[:, 0] + 1j * off[:, 1], np.zeros(50_000), covariance, known)
    assert np.mean(en > 1) == pytest.approx(0.05, abs=0.004)
    assert pytest.approx(np.sqrt(-2 * np.log(0.05)), abs=1e-4) == FACTOR_2D


@pytest.mark.parametrize(
    ("change", "passed"),
    [
        ({}, True),
        ({7: 1.2}, True),
        ({7: 1.6}, False),
        (dict.fromkeys(range(6), 1.1), False),
        ({3: -1.6}, False),
    ],
)
def test_a_verification_forgives_one_in_twenty_but_no_great_one(change, passed):
    en = np.full(100, 0.4)
    for index, value in change.items():
        en[index] = value
    found = verify(np.arange(100.0), en)
    assert found.passed is passed
    if len(change) == 1:
        assert (found.at_hz, found.worst) == (float(next(iter(change))), abs(next(iter(change.values()))))


def test_an_en_that_is_no_number_verifies_nothing():
    with pytest.raises(ValueError, match="not numbers"):
        verify(np.array([1.0]), np.array([np.nan]))


QUIET = [0.3, -0.4, 0.2, -0.1, 0.5, -0.6, 0.1, -0.2]


@pytest.mark.parametrize(
    ("last", "state", "said"),
    [
        ([0.4], State.IN_CONTROL, ""),
        ([1.99], State.IN_CONTROL, ""),
        ([-2.1], State.WARNING, "2.1 standard deviations"),
        ([3.1], State.REFUSED, "more than 3 are refused"),
        ([2.2, 0.1, 2.3], State.REFUSED, "two of the last three"),
        ([2.2, 0.1, -2.3], State.WARNING, "2.3 standard deviations"),
        ([0.1] * 9, State.WARNING, "the last 9 lie on one side"),
        ([-1.0, -0.6, -0.1, 0.2, 0.7, 1.1], State.WARNING, "the last 6 rise all the way"),
        ([1.0, 0.6, 0.1, -0.2, -0.7, -1.1], State.WARNING, "the last 6 fall all the way"),
    ],
)
def test_rules_of_the_control_chart(last, state, said):
    # Shewhart limits and run rules, ISO 7870-2 and common practice (from memory).
    found = judge(Chart(20.0, 0.5), [20.0 + 0.5 * z for z in QUIET + last])
    assert found.state is state
    assert said in "; ".join(found.reasons)
    assert bool(found.reasons) is (state is not State.IN_CONTROL)


def test_few_false_alarms_while_all_is_well():
    generator = np.random.default_rng(12)
    chart = Chart(0.0, 1.0)
    states = [judge(chart, list(row)).state for row in generator.standard_normal((4000, 12))]
    assert np.mean([s is State.REFUSED for s in states]) < 0.007
    assert np.mean([s is State.WARNING for s in states]) < 0.07


def test_a_baseline_needs_values_that_scatter():
    found = baseline([1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0])
    assert (found.centre, found.deviation) == (4.5, pytest.approx(np.sqrt(6.0)))
    with pytest.raises(ValueError, match="3 values are too few"):
        baseline([1.0, 2.0, 3.0])
    with pytest.raises(ValueError, match="do not scatter"):
        baseline([1.0] * 10)
    with pytest.raises(ValueError, match="at least one value"):
        judge(Chart(0.0, 1.0), [])


def seen(end: float, directivity: float = 0.010, match: float = 0.020, length: float = 0.15) -> np.ndarray:
    """An air line and its end through a port's residual errors."""
    gamma = end * np.exp(-4j * np.pi * F_HZ * length / LIGHT)
    return directivity + gamma / (1.0 - match * gamma)


@pytest.mark.parametrize(("end", "half"), [(0.15, 0.01045), (-1.0, 0.03001)])
def test_half_ripples_of_the_air_line(end, half):
    # Computed beforehand for l = 150 mm, delta = 0.010, mu = 0.020: delta + mu G^2 and delta + mu.
    assert pytest.approx(999.31e6, rel=1e-5) == LIGHT / 0.3
    _, found = half_ripple(F_HZ, seen(end), 0.15)
    assert found == pytest.approx(half, abs=1e-4)


def test_effective_directivity_and_source_match_come_out():
    found = effective_terms(F_HZ, seen(0.15), seen(-1.0), 0.15)
    assert found.directivity == pytest.approx(0.010, abs=1e-4)
    assert found.source_match == pytest.approx(0.020, abs=1e-4)
    assert found.f_hz[0] == pytest.approx(1.5e9, abs=11e6)


def test_noise_does_not_add_up_in_a_ripple():
    generator = np.random.default_rng(13)
    noise = 1e-3 * (generator.standard_normal(401) + 1j * generator.standard_normal(401))
    _, found = half_ripple(F_HZ, seen(0.15) + noise, 0.15)
    assert found.mean() == pytest.approx(0.01045, abs=1e-4)


@pytest.mark.parametrize(
    ("length", "points", "said"),
    [(0.03, 401, "take a longer line or a wider sweep"), (2.0, 101, "use at least 8 points")],
)
def test_a_ripple_that_cannot_be_seen_is_refused(length, points, said):
    f_hz = np.linspace(1e9, 5e9, points)
    with pytest.raises(ValueError, match=said):
        half_ripple(f_hz, np.ones(points, complex), length)


def test_a_load_that_reflects_all_is_refused():
    with pytest.raises(ValueError, match=r"use one of about 0\.1 to 0\.2"):
        effective_terms(F_HZ, seen(0.9), seen(-1.0), 0.15)


def test_length_of_a_line_for_some_periods():
    assert LIGHT / (2 * least_length_m(1e9, 5e9, 4.0)) == pytest.approx(1e9)
