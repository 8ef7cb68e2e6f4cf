"""Values in bench files: numbers with their unit as text."""

from __future__ import annotations

import functools
import re
from typing import Any

__all__ = ["number", "share"]

_WRITTEN = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?|[+-]?inf)\s*(\D*)", re.ASCII)
_PREFIXES = {
    "f": -15, "p": -12, "n": -9, "u": -6, "µ": -6, "μ": -6, "m": -3, "k": 3, "K": 3, "M": 6, "G": 9, "T": 12,
}  # fmt: skip
"""Their powers of ten."""
_UNITS = ("", "Hz", "s", "F", "H", "ohm", "Ohm", "Ω", "ohm/s", "Ω/s", "V", "A", "W")
_WHOLE = ("dB", "dBm", "dBc", "dB/K", "K", "1/K", "ppm/K", "degrees")
"""Units that take no prefix."""


def number(value: Any) -> float:
    """A value in SI units, from ``"30 ps"``, ``"1.3 Gohm/s"``, ``"-40 dB"`` or a plain number.

    Raises
    ------
    ValueError
        If it is not one, or of a unit that no part or instrument has.

    Examples
    --------
    >>> number("30 ps")
    3e-11
    """
    if isinstance(value, int | float) and not isinstance(value, bool) and value == value:
        return float(value)
    return _read(str(value).strip())


@functools.lru_cache(1000)
def _read(text: str) -> float:
    match = _WRITTEN.fullmatch(text)
    if match is None:
        raise ValueError(f"{text!r} is no value with a unit")
    amount, unit = match[1], match[2]
    if unit in _UNITS or unit in _WHOLE:
        return float(amount)
    if unit[0] in _PREFIXES and unit[1:] in _UNITS:
        mantissa, _, power = amount.lower().partition("e")
        # Through text, so that "30 ps" is 3e-11 and not its neighbour.
        return float(f"{mantissa}e{int(power or 0) + _PREFIXES[unit[0]]}")
    raise ValueError(
        f"{text!r} has the unit {unit!r}, which nothing here has; known are "
        f"{', '.join([*_UNITS[1:], *_WHOLE])}, most with a prefix"
    )


def share(value: Any) -> float:
    """A relative amount from ``"2 %"``.

    Raises
    ------
    ValueError
        If it is none.

    Examples
    --------
    >>> share("15 %")
    0.15
    """
    match = re.fullmatch(r"([+-]?(?:\d+\.?\d*|\.\d+))\s*%", str(value).strip(), re.ASCII)
    if match is None:
        raise ValueError(f"{value!r} is no percentage")
    return float(match[1]) / 100.0
