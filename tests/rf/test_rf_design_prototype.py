"""Prototypes against published tables and against their defining response, for any terminations."""

from __future__ import annotations

from math import factorial

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.rf.design import Prototype, bessel, butterworth, chebyshev

W = np.linspace(0.0, 3.0, 301)

# Matthaei, Young and Jones (Butterworth, equal terminations; also by 2 sin((2k-1) pi / 2n)).
BUTTERWORTH = {
    1: (2.0,), 2: (1.4142, 1.4142), 3: (1.0, 2.0, 1.0), 4: (0.7654, 1.8478, 1.8478, 0.7654),
    5: (0.6180, 1.6180, 2.0, 1.6180, 0.6180), 6: (0.5176, 1.4142, 1.9319, 1.9319, 1.4142, 0.5176),
    7: (0.4450, 1.2470, 1.8019, 2.0, 1.8019, 1.2470, 0.4450),
}  # fmt: skip
# The same source, Chebyshev: (ripple dB, order): elements and what the table prints behind them.
CHEBYSHEV = {
    (0.1, 1): (0.3052, 1.0), (0.1, 2): (0.8430, 0.6220, 1.3554), (0.1, 3): (1.0316, 1.1474, 1.0316, 1.0),
    (0.1, 4): (1.1088, 1.3062, 1.7704, 0.8181, 1.3554),
    (0.1, 5): (1.1468, 1.3712, 1.9750, 1.3712, 1.1468, 1.0),
    (0.1, 6): (1.1681, 1.4040, 2.0562, 1.5171, 1.9029, 0.8618, 1.3554),
    (0.1, 7): (1.1812, 1.4228, 2.0967, 1.5734, 2.0967, 1.4228, 1.1812, 1.0),
    (0.5, 2): (1.4029, 0.7071, 1.9841), (0.5, 3): (1.5963, 1.0967, 1.5963, 1.0),
    (0.5, 4): (1.6703, 1.1926, 2.3661, 0.8419, 1.9841),
    (0.5, 5): (1.7058, 1.2296, 2.5408, 1.2296, 1.7058, 1.0),
    (0.5, 6): (1.7254, 1.2479, 2.6064, 1.3137, 2.4758, 0.8696, 1.9841),
    (3.0, 2): (3.1013, 0.5339, 5.8089), (3.0, 3): (3.3487, 0.7117, 3.3487, 1.0),
    (3.0, 4): (3.4389, 0.7483, 4.3470, 0.5920, 5.8089),
    (3.0, 7): (3.5185, 0.7722, 4.6390, 0.8038, 4.6390, 0.7722, 3.5185, 1.0),
}  # fmt: skip
# Maximally flat delay of 1 s, equal terminations: Pozar, table 8.5 (from memory).
BESSEL_DELAY = {
    1: (2.0,), 2: (1.5774, 0.4226), 3: (1.2550, 0.5528, 0.1922), 4: (1.0598, 0.5116, 0.3181, 0.1104),
    5: (0.9303, 0.4577, 0.3312, 0.2090, 0.0718),
}  # fmt: skip
# The same with half the power at 1 rad/s, from the other end: Zverev (from memory).
BESSEL_HALF = {
    2: (0.5755, 2.1478), 3: (0.3374, 0.9705, 2.2034), 4: (0.2334, 0.6725, 1.0815, 2.2404),
    5: (0.1743, 0.5072, 0.8040, 1.1110, 2.2582),
}  # fmt: skip


@pytest.mark.parametrize(("order", "g"), BUTTERWORTH.items())
def test_butterworth_is_the_table(order: int, g) -> None:
    assert_allclose(butterworth(order).g, g, atol=5.1e-5)
    assert butterworth(order).last == 1.0


@pytest.mark.parametrize(("which", "row"), CHEBYSHEV.items())
def test_chebyshev_is_the_table(which, row) -> None:
    ripple, order = which
    found = chebyshev(order, ripple)
    assert_allclose([*found.g, found.last], row, atol=1.1e-4)


@pytest.mark.parametrize(("order", "g"), BESSEL_DELAY.items())
def test_bessel_of_unit_delay_is_the_table(order: int, g) -> None:
    assert_allclose(bessel(order, cutoff="delay").g, g, atol=6e-5)


@pytest.mark.parametrize(("order", "g"), BESSEL_HALF.items())
def test_bessel_of_half_power_is_the_table(order: int, g) -> None:
    assert_allclose(bessel(order).g[::-1], g, atol=6e-5)


@pytest.mark.parametrize("order", [2, 5, 13, 20])
def test_half_the_sum_is_the_delay_at_zero(order: int) -> None:
    """Equal terminations: tau(0) = sum(g) / 2 (facts of the ladder; 1 s by the normalisation)."""
    assert_allclose(sum(bessel(order, cutoff="delay").g) / 2, 1.0, rtol=1e-12)
    assert_allclose(sum(butterworth(order).g) / 2, 1 / np.sin(np.pi / (2 * order)), rtol=1e-12)


def attenuation(prototype: Prototype, w: float) -> float:
    return float(-20 * np.log10(np.abs(prototype.transmission(np.array([w]))[0])))


@pytest.mark.parametrize(
    ("prototype", "w", "db"),
    [
        (butterworth(3), 2.0, 18.1291), (butterworth(5), 1.5, 17.6838), (butterworth(7), 2.0, 42.1445),
        (chebyshev(3, 0.5), 2.0, 19.2161), (chebyshev(5, 0.5), 2.0, 42.0387),
        (chebyshev(5, 0.1), 1.5, 19.4988),
        (chebyshev(7, 0.1), 2.0, 57.7243), (chebyshev(3, 3.0), 2.0, 28.2853),
    ],
)  # fmt: skip
def test_attenuation_at_a_frequency(prototype: Prototype, w: float, db: float) -> None:
    """From the defining formulas, 10 log10(1 + w^2n) and 10 log10(1 + e^2 T_n^2(w))."""
    assert_allclose(attenuation(prototype, w), db, atol=6e-5)


def passed(load: float) -> float:
    return 4 * load / (1 + load) ** 2


def defining(kind: str, order: int, load: float) -> np.ndarray:
    """|S21|^2 by its definition, worked out without any ladder."""
    if kind == "butterworth":
        return passed(load) / (1 + W ** (2 * order))
    if kind == "chebyshev":
        e2 = 10**0.05 - 1
        t = np.polynomial.chebyshev.chebval(W, [0] * order + [1])
        return passed(load) * ((1 + e2) if order % 2 == 0 else 1) / (1 + e2 * t**2)
    c = [factorial(2 * order - k) / (2 ** (order - k) * factorial(k) * factorial(order - k))
         for k in range(order + 1)]  # fmt: skip
    return passed(load) * np.abs(c[0] / np.polyval(c[::-1], 1j * W)) ** 2


def build(kind: str, order: int, load: float, first: str | None = None) -> Prototype:
    if kind == "butterworth":
        return butterworth(order, load, first)
    return chebyshev(order, 0.5, load, first) if kind == "chebyshev" else bessel(order, load, first, "delay")


@pytest.mark.parametrize("kind", ["butterworth", "chebyshev", "bessel"])
@pytest.mark.parametrize("load", [0.02, 0.3, 1.0, 4.0, 50.0])
@pytest.mark.parametrize("order", [1, 2, 3, 4, 5, 8, 9])
def test_any_terminations_have_the_defining_response(kind: str, load: float, order: int) -> None:
    """Both a first capacitor and a first coil, where the resistances allow it; all elements positive."""
    if kind == "chebyshev" and order % 2 == 0 and load == 1.0:
        with pytest.raises(ValueError, match="cannot end in 1 times its source"):
            build(kind, order, load)
        return
    firsts = ("shunt", "series") if order % 2 or load == 1.0 else (None,)
    for first in firsts:
        found = build(kind, order, load, first)
        assert min(found.g) > 0
        assert_allclose(np.abs(found.transmission(W)) ** 2, defining(kind, order, load), atol=1e-10)


@settings(derandomize=True, max_examples=25, deadline=None)
@given(
    kind=st.sampled_from(["butterworth", "chebyshev", "bessel"]), order=st.integers(1, 11),
    load=st.floats(0.01, 0.3), up=st.booleans(),
)  # fmt: skip
def test_a_ladder_read_from_its_other_end_is_its_dual(kind: str, order: int, load: float, up: bool) -> None:
    """Beginning in series with the inverse load gives the same numbers (duality)."""
    load = 1 / load if up else load
    one = build(kind, order, load)
    other = build(kind, order, 1 / load, "series" if one.first == "shunt" else "shunt")
    assert_allclose(other.g, one.g, rtol=1e-9)


@pytest.mark.parametrize("order", [24, 59])
def test_high_orders_keep_their_digits(order: int) -> None:
    found = butterworth(order)
    assert_allclose(found.g, 2 * np.sin((2 * np.arange(1, order + 1) - 1) * np.pi / (2 * order)), rtol=1e-12)
    peak = np.abs(chebyshev(order | 1, 0.1).transmission(np.linspace(0, 1, 997)))
    assert_allclose([-20 * np.log10(peak.min()), peak.max()], [0.1, 1.0], atol=1e-3)


@pytest.mark.parametrize(
    ("make", "said"),
    [
        (lambda: butterworth(0), "order 0 is out of range; allowed are 1 to 60"),
        (lambda: butterworth(61), "allowed are 1 to 60"),
        (lambda: butterworth(3, 0.0), "a load of 0 times the source"),
        (lambda: butterworth(3, 1.0, "middle"), "'shunt' or 'series', not 'middle'"),
        (lambda: butterworth(4, 2.0, "shunt"), "begins in series, not in shunt"),
        (lambda: butterworth(4, 0.5, "series"), "begins in shunt, not in series"),
        (lambda: chebyshev(3, 0.0), "a ripple of 0 dB is out of range"),
        (lambda: chebyshev(4, 0.5, 1.0), "cannot end in 1 times its source; allowed are 0.504 or less"),
        (lambda: bessel(21), "order 21 is out of range; allowed are 1 to 20"),
        (lambda: bessel(3, cutoff="knee"), "'3 dB' or 'delay', not 'knee'"),
    ],
)
def test_what_no_ladder_can_do_is_refused(make, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        make()
