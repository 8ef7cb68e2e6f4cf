"""Values in bench files: numbers with their unit as text."""

from __future__ import annotations

import re
from typing import Any

from quantiphy import Quantity

__all__ = ["number", "share"]


def number(value: Any) -> float:
    """A value in SI units, from ``"30 ps"``, ``"1.3 Gohm/s"``, ``"-40 dB"`` or a plain number.

    Raises
    ------
    ValueError
        If it is not one.

    Examples
    --------
    >>> number("30 ps")
    3e-11
    """
    if isinstance(value, int | float) and not isinstance(value, bool):
        return float(value)
    text = re.sub(r"\s+(dBm|dB|%)\S*$", "", str(value).strip())
    try:
        return float(text)
    except ValueError:
        pass
    try:
        return float(Quantity(text).real)
    except Exception as error:  # the library's own errors share no base with ValueError
        raise ValueError(f"{value!r} is no value with a unit") from error


def share(value: Any) -> float:
    """A relative amount from ``"2 %"``.

    Examples
    --------
    >>> share("15 %")
    0.15
    """
    text = str(value).strip()
    if not text.endswith("%"):
        raise ValueError(f"{value!r} is no percentage")
    return float(text[:-1]) / 100.0
