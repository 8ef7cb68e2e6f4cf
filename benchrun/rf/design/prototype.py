r"""Low-pass prototypes: element values of lossless ladders between resistances, cut-off 1 rad/s.

Butterworth and Chebyshev come from the closed form for any two terminations (Takahasi 1951; equal
terminations give the formulas of Matthaei, Young and Jones; from memory), Bessel from its polynomial by
continued fraction (:mod:`.synthesis`).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from benchrun.rf.design.synthesis import ladder_of
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["BESSEL_HIGHEST", "Prototype", "bessel", "butterworth", "chebyshev"]

BESSEL_HIGHEST = 20
HIGHEST = 60


@dataclass(frozen=True, slots=True)
class Prototype:
    """A low-pass ladder between 1 ohm and ``load`` ohm.

    Parameters
    ----------
    name
        In words.
    g
        Element values from the source on: farad of a shunt capacitor, henry of a series coil, in turn.
    load
        Resistance of the load over that of the source.
    first
        ``"shunt"`` or ``"series"``: where the first element stands.
    """

    name: str
    g: tuple[float, ...]
    load: float
    first: str

    @property
    def last(self) -> float:
        """The value tables print behind g: conductance behind a series coil, resistance behind a shunt."""
        last_is_shunt = (self.first == "shunt") == (len(self.g) % 2 == 1)
        return self.load if last_is_shunt else 1.0 / self.load

    def transmission(self, w: FloatArray) -> ComplexArray:
        """S21 between its own terminations at angular frequencies ``(f,)``, by chain matrices."""
        a, b = np.ones(w.shape, complex), np.zeros(w.shape, complex)
        c, d = np.zeros(w.shape, complex), np.ones(w.shape, complex)
        shunt = self.first == "shunt"
        for g in self.g:
            x = 1j * w * g
            if shunt:
                a, c = a + b * x, c + d * x
            else:
                b, d = b + a * x, d + c * x
            shunt = not shunt
        return np.asarray(2.0 * np.sqrt(self.load) / (a * self.load + b + c * self.load + d))


def butterworth(order: int, load: float = 1.0, first: str | None = None) -> Prototype:
    """Maximally flat: 3.0103 dB at 1 rad/s, below the loss that unequal terminations make at 0.

    Parameters
    ----------
    order
        1 to 60.
    load
        Resistance of the load over that of the source, positive.
    first
        ``"shunt"``, ``"series"``, or None for what the load allows (shunt, if both).

    Raises
    ------
    ValueError
        For an order or load out of range, or a first element that cannot go with the load: an even order
        ends in a coil if it begins with a capacitor, and steps resistance down.

    Examples
    --------
    >>> [round(g, 4) for g in butterworth(3).g]
    [1.0, 2.0, 1.0]
    """
    first = _checked(order, load, first)
    mirrored = _mirrored(order, load, first)
    match = abs(load - 1.0) / (load + 1.0)
    alpha = match ** (1.0 / order) * (-1.0 if mirrored else 1.0)
    g = _recursion(order, 1.0, alpha, lambda m: 1.0 + alpha**2 - 2.0 * alpha * np.cos(m * np.pi / order))
    return Prototype(f"Butterworth, order {order}", g, load, first)


def chebyshev(order: int, ripple_db: float, load: float | None = None, first: str | None = None) -> Prototype:
    """Equal ripple: the loss swings by ``ripple_db`` up to 1 rad/s.

    Parameters
    ----------
    order
        1 to 60.
    ripple_db
        0.001 to 10.
    load
        Resistance of the load over that of the source; None for 1, or for an even order the nearest that
        is possible, ``tanh(beta/4)**2`` or its inverse (an even order has its ripple's loss at 0, where only
        the terminations can make it).
    first
        As of :func:`butterworth`.

    Raises
    ------
    ValueError
        For values out of range, or an even order whose load lies too near 1.

    Examples
    --------
    >>> proto = chebyshev(2, 0.5)
    >>> [round(g, 4) for g in proto.g], round(proto.last, 4)
    ([1.4029, 0.7071], 1.9841)
    """
    if not 1e-3 <= ripple_db <= 10.0:
        raise ValueError(f"a ripple of {ripple_db:g} dB is out of range; allowed are 0.001 dB to 10 dB")
    epsilon = np.sqrt(10.0 ** (ripple_db / 10.0) - 1.0)
    swing = 1.0 + epsilon**2
    # tanh^2(beta/4) of the tables, as the resistance that makes the ripple's loss at 0.
    nearest = float((np.sqrt(swing) - epsilon) ** 2) if order % 2 == 0 else 1.0
    if load is None:
        load = 1.0 / nearest if first == "series" else nearest
    first = _checked(order, load, first)
    passed = 4.0 * load / (1.0 + load) ** 2 * (swing if order % 2 == 0 else 1.0)
    if passed > 1.0 + 1e-9:
        raise ValueError(
            f"a Chebyshev ladder of even order {order} with {ripple_db:g} dB ripple cannot end in {load:g} "
            f"times its source; allowed are {nearest:.4g} or less, {1 / nearest:.4g} or more, or an odd order"
        )
    mirrored = _mirrored(order, load, first)
    x = float(np.sinh(np.arcsinh(1.0 / epsilon) / order))
    y = float(np.sinh(np.arcsinh(np.sqrt(max(1.0 - passed, 0.0)) / epsilon) / order))
    y = -y if mirrored else y

    def between(m: int) -> float:
        angle = m * np.pi / order
        return float(x**2 + y**2 + np.sin(angle) ** 2 - 2.0 * x * y * np.cos(angle))

    return Prototype(
        f"Chebyshev, order {order}, {ripple_db:g} dB", _recursion(order, x, y, between), load, first
    )


def bessel(order: int, load: float = 1.0, first: str | None = None, cutoff: str = "3 dB") -> Prototype:
    """Maximally flat delay (Thomson).

    Parameters
    ----------
    order
        1 to 20.
    load, first
        As of :func:`butterworth`.
    cutoff
        ``"3 dB"``: half the power at 1 rad/s, as of the others; ``"delay"``: a delay of 1 s at 0.

    Raises
    ------
    ValueError
        For an order, load, first element or cut-off out of range.

    Examples
    --------
    >>> [round(g, 4) for g in bessel(2, cutoff="delay").g]
    [1.5774, 0.4226]
    """
    if order > BESSEL_HIGHEST:
        raise ValueError(
            f"a Bessel ladder of order {order} is out of range; allowed are 1 to {BESSEL_HIGHEST}"
        )
    if cutoff not in ("3 dB", "delay"):
        raise ValueError(f"the cut-off of a Bessel ladder is '3 dB' or 'delay', not {cutoff!r}")
    first = _checked(order, load, first)
    coefficients, value = [1], 1
    for k in range(order, 0, -1):  # b_{k-1} = b_k * (2n-k+1) k / (2 (n-k+1))
        value = value * (2 * order - k + 1) * k // (2 * (order - k + 1))
        coefficients.append(value)
    g = ladder_of(tuple(coefficients[::-1]), load, _mirrored(order, load, first))
    proto = Prototype(f"Bessel, order {order}", g, load, first)
    if cutoff == "delay":
        return proto
    low, high = 0.1, 10.0 * order
    at_zero = abs(proto.transmission(np.zeros(1))[0]) ** 2 / 2.0
    for _ in range(100):  # the magnitude of a Bessel filter only falls
        middle = (low * high) ** 0.5
        if abs(proto.transmission(np.array([middle]))[0]) ** 2 > at_zero:
            low = middle
        else:
            high = middle
    return Prototype(proto.name, tuple(x * low for x in g), load, first)


def _checked(order: int, load: float, first: str | None) -> str:
    if not 1 <= order <= HIGHEST:
        raise ValueError(f"a ladder of order {order} is out of range; allowed are 1 to {HIGHEST}")
    if not 1e-3 <= load <= 1e3:
        raise ValueError(f"a load of {load:g} times the source is out of range; allowed are 0.001 to 1000")
    if first not in (None, "shunt", "series"):
        raise ValueError(f"the first element stands in 'shunt' or 'series', not {first!r}")
    natural = "series" if order % 2 == 0 and load > 1.0 else "shunt"
    if first is None:
        return natural
    if order % 2 == 0 and load != 1.0 and first != natural:
        raise ValueError(
            f"a ladder of even order whose load is {load:g} times its source begins in {natural}, not in "
            f"{first}; take an odd order, or let it begin so"
        )
    return first


def _mirrored(order: int, load: float, first: str) -> bool:
    """Whether the reflection's zeros lie to the right, which turns its sign at 0 for an odd order.

    With its zeros to the left, a ladder that begins in shunt sees a load below 1 (at 0 the reflection is
    negative there), and one that begins in series sees one above 1.
    """
    return order % 2 == 1 and (load > 1.0 if first == "shunt" else load < 1.0)


def _recursion(order: int, x: float, y: float, between: Callable[[int], float]) -> tuple[float, ...]:
    sine = [np.sin((2 * m - 1) * np.pi / (2 * order)) for m in range(1, order + 1)]
    g = [2.0 * sine[0] / (x - y)]
    for m in range(1, order):
        g.append(4.0 * sine[m - 1] * sine[m] / (between(m) * g[-1]))
    return tuple(float(v) for v in g)
