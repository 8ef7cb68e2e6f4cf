"""Preferred values of parts: the E series of IEC 60063."""

from __future__ import annotations

import math
from collections.abc import Mapping

__all__ = ["SERIES", "TOLERANCE", "nearest", "neighbours"]

_E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)


def _rounded(count: int) -> tuple[float, ...]:
    values = [round(10 ** (i / count), 2) for i in range(count)]
    if count == 192:  # the standard's one exception to its rule: 9.20, where the rule gives 9.19
        values[185] = 9.20
    return tuple(values)


SERIES: Mapping[str, tuple[float, ...]] = {
    "E3": tuple(v / 10 for v in _E24[::8]),
    "E6": tuple(v / 10 for v in _E24[::4]),
    "E12": tuple(v / 10 for v in _E24[::2]),
    "E24": tuple(v / 10 for v in _E24),
    "E48": _rounded(48),
    "E96": _rounded(96),
    "E192": _rounded(192),
}
"""Values of one decade, from 1 up."""

TOLERANCE: Mapping[str, float] = {
    "E3": 0.4, "E6": 0.2, "E12": 0.1, "E24": 0.05, "E48": 0.02, "E96": 0.01, "E192": 0.005,
}  # fmt: skip
"""The tolerance that goes with each series, relative (common practice; E3's is no longer used)."""


def neighbours(value: float, series: str) -> tuple[float, float]:
    """Preferred values at or below, and at or above a value.

    Raises
    ------
    ValueError
        For an unknown series or a value that is not positive and finite.

    Examples
    --------
    >>> neighbours(3.1831e-12, "E12")
    (2.7e-12, 3.3e-12)
    """
    if series not in SERIES:
        raise ValueError(f"{series!r} is no series of preferred values; known are {', '.join(SERIES)}")
    if not (math.isfinite(value) and value > 0):
        raise ValueError(f"a part's value of {value:g} has no preferred neighbour; it must be positive")
    decade = math.floor(math.log10(value))
    around = [
        float(f"{mantissa:.2f}e{exponent}")
        for exponent in (decade - 1, decade, decade + 1)
        for mantissa in SERIES[series]
    ]
    # A value that is preferred but for its last bit is its own neighbour on both sides.
    below = max(v for v in around if v <= value * (1 + 1e-9))
    above = min(v for v in around if v >= value * (1 - 1e-9))
    return below, above


def nearest(value: float, series: str) -> float:
    """Preferred value nearest by ratio, the lower one of two equally near.

    Raises
    ------
    ValueError
        As of :func:`neighbours`.

    Examples
    --------
    >>> nearest(15.9155e-9, "E24")
    1.6e-08
    """
    below, above = neighbours(value, series)
    return below if value / below <= above / value else above
