"""Data elements to values, as a command wants them: numbers with units, switches, keywords, strings."""

from __future__ import annotations

import math
from collections.abc import Sequence

from sim_instruments.scpi.element import Kind, kind_of, number_parts
from sim_instruments.scpi.errors import ScpiError

__all__ = ["FREQUENCY", "POWER", "TIME", "boolean", "choice", "number", "numbers", "short", "string", "whole"]

FREQUENCY = {"HZ": 1.0, "KHZ": 1e3, "MHZ": 1e6, "MAHZ": 1e6, "GHZ": 1e9}
"""M is mega before HZ, against the rule (SCPI-1999 Vol. 1, 7.3, from memory)."""
TIME = {"S": 1.0, "MS": 1e-3, "US": 1e-6, "NS": 1e-9}
POWER = {"DBM": 1.0}

_REFUSED: dict[Kind, int] = {"number": -128, "word": -148, "string": -158, "block": -168, "expression": -178}


def number(
    element: str,
    low: float,
    high: float,
    suffixes: dict[str, float] | None = None,
    default: float | None = None,
) -> float:
    """A numeric parameter within its range; MINimum, MAXimum and, where there is one, DEFault count.

    Raises
    ------
    ScpiError
        -131, -138, -141, -158, -168, -178 or -222.

    Examples
    --------
    >>> number("1.5 GHZ", 0, 1e10, FREQUENCY), number("MAX", 0, 1e10), number("#B101", 0, 10)
    (1500000000.0, 10000000000.0, 5.0)
    """
    kind = kind_of(element)
    if kind == "word":
        word = element.upper()
        if word in ("MIN", "MINIMUM"):
            return low
        if word in ("MAX", "MAXIMUM"):
            return high
        if word in ("DEF", "DEFAULT") and default is not None:
            return default
        raise ScpiError(-141, element)
    value = _plain(element, kind, suffixes)
    if not math.isfinite(value) or not low <= value <= high:
        raise ScpiError(-222, element[:40])
    return value


def _plain(element: str, kind: Kind, suffixes: dict[str, float] | None) -> float:
    if kind != "number":
        raise ScpiError(_REFUSED[kind], element[:40])
    value, suffix = number_parts(element)
    if suffix:
        if not suffixes:
            raise ScpiError(-138, element[:40])
        if suffix not in suffixes:
            raise ScpiError(-131, element[:40])
        value *= suffixes[suffix]
    return value


def whole(element: str, low: int, high: int, default: int | None = None) -> int:
    """A whole number; fractions are rounded (IEEE 488.2, 7.7.2), and then must lie in the range."""
    if kind_of(element) == "word":
        return round(number(element, low, high, None, default))
    value = _plain(element, kind_of(element), None)
    if not math.isfinite(value) or not low <= round(value) <= high:
        raise ScpiError(-222, element[:40])
    return round(value)


def numbers(
    elements: Sequence[str], low: float, high: float, suffixes: dict[str, float] | None = None
) -> list[float]:
    """A list of numeric parameters."""
    return [number(element, low, high, suffixes) for element in elements]


def boolean(element: str) -> bool:
    """ON, OFF, or a number that rounds to zero or not."""
    if kind_of(element) == "word":
        if element.upper() in ("ON", "OFF"):
            return element.upper() == "ON"
        raise ScpiError(-141, element)
    return whole(element, -32768, 32767) != 0


def choice(element: str, *keywords: str) -> str:
    """One of several keywords in short or long form; gives the long form as written here.

    Raises
    ------
    ScpiError
        -224 for another word; -128, -158, -168 or -178 for no word.
    """
    kind = kind_of(element)
    if kind != "word":
        raise ScpiError(_REFUSED[kind], element[:40])
    for keyword in keywords:
        if element.upper() in (keyword.upper(), short(keyword)):
            return keyword
    raise ScpiError(-224, element)


def string(element: str) -> str:
    """A quoted string without its quotes.

    Raises
    ------
    ScpiError
        -128, -148, -168 or -178 for anything else.

    Examples
    --------
    >>> string("'it''s'")
    "it's"
    """
    kind = kind_of(element)
    if kind != "string":
        raise ScpiError(_REFUSED[kind], element[:40])
    return element[1:-1].replace(element[0] * 2, element[0])


def short(keyword: str) -> str:
    """The capitals of a keyword, which are its short form.

    Examples
    --------
    >>> short("FREQuency")
    'FREQ'
    """
    return "".join(c for c in keyword if c.isupper() or not c.isalpha())
