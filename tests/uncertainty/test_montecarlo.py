"""The Monte Carlo method against the worked examples of its guide, and its parts against plain counting."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchrun.uncertainty.montecarlo import adaptive, compare, shortest, summarise, symmetric, tolerance


def loss(x1: float, trials: int, seed: int = 1) -> np.ndarray:
    """JCGM 101, 9.4: comparison loss of a power meter, Y = X1^2 + X2^2, u1 = u2 = 0.005."""
    generator = np.random.default_rng(seed)
    return (x1 + 0.005 * generator.standard_normal(trials)) ** 2 + (
        0.005 * generator.standard_normal(trials)
    ) ** 2


@pytest.mark.parametrize(
    ("x1", "mean", "standard", "interval"),
    # Mean and u in closed form (E = x1^2 + 2 u^2, u(y) = 2 u sqrt(x1^2 + u^2)); intervals as published in
    # JCGM 101:2008, 9.4 (from memory). The least of all spans is flat, so its place is known less well.
    [
        (0.000, 50e-6, 50e-6, (0.0, 150e-6)),
        (0.010, 150e-6, 111.8e-6, (0.0, 367e-6)),
        (0.050, 2550e-6, 502.5e-6, (1590e-6, 3543e-6)),
    ],
)
def test_jcgm_101_comparison_loss(x1, mean, standard, interval):
    found = summarise(loss(x1, 400_000))
    assert found.mean == pytest.approx(mean, rel=0.005)
    assert found.standard == pytest.approx(standard, rel=0.01)
    assert found.shortest == pytest.approx(interval, abs=max(8e-6, 0.04 * standard))


def test_first_order_is_found_wanting_where_it_is():
    # At x1 = 0 first-order propagation says u = 0 (JCGM 101, 9.4.3); a sum it takes as it is (9.2.2).
    assert not compare(0.0, 1e-9, summarise(loss(0.0, 100_000))).agrees
    assert not compare(100e-6, 100e-6, summarise(loss(0.010, 100_000)), digits=2).agrees
    total = np.random.default_rng(6).standard_normal((4, 200_000)).sum(0)
    assert compare(0.0, 2.0, summarise(total), digits=2).agrees


def test_jcgm_101_sum_of_four_rectangular_quantities():
    # JCGM 101:2008, 9.2.3 (from memory): u = 2.0, symmetric 95 % interval -3.88 to 3.88.
    generator = np.random.default_rng(2)
    found = summarise(math.sqrt(3.0) * generator.uniform(-1, 1, (4, 400_000)).sum(0))
    assert found.standard == pytest.approx(2.0, abs=0.01)
    assert found.symmetric == pytest.approx((-3.88, 3.88), abs=0.02)


def test_intervals_hold_the_share_they_say():
    values = np.sort(np.random.default_rng(3).exponential(size=20_001))
    for low, high in (symmetric(values), shortest(values)):
        assert np.mean((values >= low) & (values <= high)) == pytest.approx(0.95, abs=2e-4)
    assert np.diff(shortest(values)) < np.diff(symmetric(values))
    assert symmetric(values)[0] == pytest.approx(-math.log(0.975), abs=0.003)
    assert shortest(values) == pytest.approx((0.0, -math.log(0.05)), abs=0.1)


def test_trials_without_a_value_are_counted_and_left_out():
    values = np.arange(100.0)
    values[:10] = np.nan
    found = summarise(values)
    assert found.lost == pytest.approx(0.1)
    assert found.mean == pytest.approx(values[10:].mean())
    with pytest.raises(ValueError, match="1 of 3 trials have a value"):
        summarise(np.array([1.0, np.nan, np.nan]))


@pytest.mark.parametrize(
    ("standard", "digits", "expected"),
    [
        (0.00035, 1, 5e-5),
        (0.00035, 2, 5e-6),
        (0.0999, 1, 5e-2),
        (2.0, 2, 0.05),
        (1e-300, 1, 5e-301),
        (0.0, 1, 0),
    ],
)
def test_tolerance_is_half_of_the_last_digit(standard, digits, expected):
    assert tolerance(standard, digits) == pytest.approx(expected, rel=1e-9)


def normal_block(size: int):
    def block(number: int) -> np.ndarray:
        return np.random.default_rng([7, number]).standard_normal((size, 2)) * [1.0, 30.0]

    return block


def test_adaptive_stops_when_the_digits_stand():
    easy = adaptive(normal_block(10_000), digits=1)
    assert (easy.blocks, easy.settled) == (2, True)
    hard = adaptive(normal_block(1_000), digits=2, most_blocks=200)
    assert hard.settled
    assert 5 < hard.blocks < 200
    assert len(hard.values) == 1_000 * hard.blocks
    errors = np.abs(hard.values.std(axis=0, ddof=1) / [1.0, 30.0] - 1.0)
    assert np.all(errors < 0.05)


def test_adaptive_gives_up_unsettled():
    found = adaptive(normal_block(100), digits=2, most_blocks=3)
    assert (found.blocks, found.settled) == (3, False)


def test_a_quantity_that_is_never_found_holds_nothing_up():
    def block(number: int) -> np.ndarray:
        values = normal_block(10_000)(number)
        values[:, 1] = np.nan
        return values

    assert adaptive(block).settled
