"""A lossless ladder from the polynomial of its response, by continued fraction in many digits.

With the response ``S21 = K / E(s)`` the reflection's zeros follow from ``F(s) F(-s) = E(s) E(-s) - K^2``
(Feldtkeller), the input impedance from ``(E + F) / (E - F)``, and the elements one by one from its poles at
infinity. Each step takes the difference of nearly equal numbers, so all is done in decimal arithmetic.
"""

from __future__ import annotations

from decimal import Decimal, localcontext

import numpy as np

__all__ = ["ladder_of"]

_DIGITS = 120
_Pair = tuple[Decimal, Decimal]


def ladder_of(e: tuple[int, ...], load: float, mirrored: bool) -> tuple[float, ...]:
    """Element values of the ladder between 1 ohm and ``load`` ohm whose response is ``const / E(s)``.

    Parameters
    ----------
    e
        Coefficients of E from the constant one up, the last one 1; its zeros lie to the left.
    load
        Over the source.
    mirrored
        Whether the zeros of the reflection are taken to the right instead of to the left.

    Returns
    -------
    tuple of float
        From the source on; the same whether the first stands in shunt or in series (duality).
    """
    with localcontext() as context:
        context.prec = _DIGITS
        order, r = len(e) - 1, Decimal(repr(load))
        big = [Decimal(c) for c in e]
        passed = 4 * r / (1 + r) ** 2 * big[0] ** 2
        # E(s) E(-s) in powers of x = s^2; its constant less what is passed.
        even = [_at_square(big, m) for m in range(order + 1)]
        even[0] -= passed
        f = [Decimal(1)]
        if abs(load - 1.0) < 1e-12:  # a match at 0 puts one zero exactly there
            even = even[1:]
            f = [Decimal(0), Decimal(1)]
        for factor in _left_half(even):
            f = _times(f, factor)
        if mirrored:  # F(-s), its leading coefficient made 1 again
            f = [c * (-1) ** (order - i) for i, c in enumerate(f)]
        # Begins in shunt: at high frequency a short, S11 = -F/E, so that Y = (E + F) / (E - F); in series the
        # same quotient is Z. Either begins with a pole at infinity.
        over = [a + b for a, b in zip(big, f, strict=True)]
        under = [a - b for a, b in zip(big, f, strict=True)][:-1]
        found = []
        for _ in range(order):
            g = over[-1] / under[-1]
            found.append(float(g))
            rest = [a - g * b for a, b in zip(over, [Decimal(0), *under], strict=True)]
            over, under = under, rest[: len(under) - 1]
        return tuple(found)


def _at_square(e: list[Decimal], m: int) -> Decimal:
    """Coefficient of ``s^(2m)`` in ``E(s) E(-s)``."""
    terms = (e[i] * e[2 * m - i] * (-1) ** i for i in range(len(e)) if 0 <= 2 * m - i < len(e))
    return sum(terms, Decimal(0))


def _times(a: list[Decimal], b: list[Decimal]) -> list[Decimal]:
    product = [Decimal(0)] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for j, y in enumerate(b):
            product[i + j] += x * y
    return product


def _left_half(even: list[Decimal]) -> list[list[Decimal]]:
    """Real factors, zeros to the left, of a polynomial in ``x = s^2`` that is one of ``F(s) F(-s)``."""
    if len(even) == 1:
        return []
    scale = float(abs(even[0] / even[-1])) ** (1.0 / (len(even) - 1))
    scaled = [float(c / even[-1]) * scale ** (i - len(even) + 1) for i, c in enumerate(even)]
    factors = []
    for start in np.roots(scaled[::-1]) * scale:
        if start.imag < -1e-9 * abs(start):
            continue  # its conjugate brings it along
        x = _polished(even, start)
        if abs(start.imag) <= 1e-9 * abs(start):
            factors.append([x[0].copy_abs().sqrt(), Decimal(1)])
        else:  # s = -(p +- jq): the factor s^2 + 2 p s + |s|^2, where s^2 = x
            size = (x[0] ** 2 + x[1] ** 2).sqrt()
            factors.append([size, 2 * ((size + x[0]) / 2).sqrt(), Decimal(1)])
    return factors


def _polished(polynomial: list[Decimal], start: complex) -> _Pair:
    """A zero to all digits, by Newton's method from one good to a few."""
    x: _Pair = (Decimal(repr(float(start.real))), Decimal(repr(float(start.imag))))
    for _ in range(12):
        value: _Pair = (Decimal(0), Decimal(0))
        slope: _Pair = (Decimal(0), Decimal(0))
        for c in reversed(polynomial):
            slope = _add(_multiply(slope, x), value)
            value = _add(_multiply(value, x), (c, Decimal(0)))
        size = slope[0] ** 2 + slope[1] ** 2
        step = _multiply(value, (slope[0] / size, -slope[1] / size))
        x = (x[0] - step[0], x[1] - step[1])
    return x


def _add(a: _Pair, b: _Pair) -> _Pair:
    return a[0] + b[0], a[1] + b[1]


def _multiply(a: _Pair, b: _Pair) -> _Pair:
    return a[0] * b[0] - a[1] * b[1], a[0] * b[1] + a[1] * b[0]
