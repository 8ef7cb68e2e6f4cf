"""Numbers with their unit as text: "10 MHz", "-10 dBm", "160 MHz to 175 MHz".

A value in a file always carries its unit; a bare number is refused where a unit is needed, because the
next reader cannot tell what was meant. Inside the program every value is a float in the unit that
:class:`Dimension` names. QuantiPhy reads and writes the SI prefixes.
"""

from __future__ import annotations

import functools
import math
import re
from enum import Enum

__all__ = ["Dimension", "QuantityError", "parse", "parse_range", "render"]


class QuantityError(ValueError):
    """A text is not a value of the kind that is wanted here."""


class Dimension(Enum):
    """What kind of value is meant: unit inside, scale (SI prefixes allowed or not), an example."""

    FREQUENCY = ("Hz", True, "169.4 MHz")
    POWER = ("dBm", False, "-10 dBm")
    RATIO = ("dB", False, "0.5 dB")
    TIME = ("s", True, "20 ms")
    IMPEDANCE = ("ohm", True, "50 ohm")
    LENGTH = ("m", True, "25 mm")
    TEMPERATURE = ("degC", False, "23 degC")
    TORQUE = ("N m", False, "0.9 N m")
    VOLTAGE = ("V", True, "5 V")
    CURRENT = ("A", True, "120 mA")
    ANGLE = ("deg", False, "10 deg")
    CAPACITANCE = ("F", True, "50 fF")
    INDUCTANCE = ("H", True, "2 pH")
    PERCENT = ("%", False, "5 %")
    LOSS_RATE = ("ohm/s", True, "1.3 Gohm/s")
    NUMBER = ("", False, "1.5")

    def __init__(self, unit: str, scaled: bool, example: str) -> None:
        self.unit = unit
        self.scaled = scaled
        self.example = example


_NUMBER = r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_TEXT = re.compile(rf"({_NUMBER})\s*([^\d\s].*)?")
_ALIASES = {
    "Ω": "ohm",
    "ohms": "ohm",
    "°C": "degC",
    "°": "deg",
    "N*m": "N m",
    "Nm": "N m",
    "sec": "s",
    "Ohm": "ohm",
}
_MINUTES = {"min": 60.0, "h": 3600.0, "d": 86400.0}
_PREFIXES = {
    "": 1.0, "f": 1e-15, "p": 1e-12, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3,
    "k": 1e3, "M": 1e6, "G": 1e9, "T": 1e12,
}  # fmt: skip
_LARGE = (Dimension.FREQUENCY, Dimension.IMPEDANCE, Dimension.LOSS_RATE)
"""Where mega and above are met at a bench; elsewhere "120 MA" is a slip for "120 mA" and may burn a part."""


def parse(text: object, dimension: Dimension) -> float:
    """Read one value.

    Parameters
    ----------
    text
        A number, a space and a unit.
    dimension
        What is wanted.

    Returns
    -------
    float
        The value in ``dimension.unit``.

    Raises
    ------
    QuantityError
        If there is no number, no unit, another unit, a prefix that no bench has use for (millihertz,
        megaamperes: M and m mistaken), or the value is not finite.

    Examples
    --------
    >>> parse("10 MHz", Dimension.FREQUENCY)
    10000000.0
    >>> parse("8 h", Dimension.TIME)
    28800.0
    >>> parse("10", Dimension.FREQUENCY)
    Traceback (most recent call last):
    ...
    benchrun.quantity.QuantityError: '10' has no unit; write it as in "169.4 MHz"
    """
    wanted = f'write it as in "{dimension.example}"'
    if not isinstance(text, str):
        raise QuantityError(
            f"{text!r} has no unit; {wanted}" if dimension.unit else f"{text!r} is no text; {wanted}"
        )
    match = _TEXT.fullmatch(text.strip())
    if match is None:
        raise QuantityError(f"{text!r} is not a value with a unit; {wanted}")
    number, unit = float(match[1]), (match[2] or "").strip()
    factor = _factor(text, unit, dimension, wanted)
    # The decimal text is scaled by the prefix as text, so that "0.3 pF" is exactly 0.3e-12.
    value = (
        float(f"{match[1]}e{round(math.log10(factor))}") if _is_decade(match[1], factor) else number * factor
    )
    if not math.isfinite(value):
        raise QuantityError(f"{text!r} is too large to be a value; {wanted}")
    return value


def _is_decade(number: str, factor: float) -> bool:
    return "e" not in number.lower() and factor not in _MINUTES.values()


def _factor(text: str, unit: str, dimension: Dimension, wanted: str) -> float:
    unit = _ALIASES.get(unit, unit)
    if not dimension.unit:
        if unit:
            raise QuantityError(f"{text!r} carries a unit where a plain number is wanted; {wanted}")
        return 1.0
    if not unit:
        raise QuantityError(f"{text!r} has no unit; {wanted}")
    if dimension is Dimension.TIME and unit in _MINUTES:
        return _MINUTES[unit]
    if unit == dimension.unit:
        return 1.0
    prefix = unit.removesuffix(dimension.unit)
    if dimension.scaled and prefix != unit and prefix in _PREFIXES:
        if dimension is Dimension.FREQUENCY and prefix == "m":
            raise QuantityError(f'{text!r} is in millihertz (m is milli); did you mean "MHz"?')
        if dimension not in _LARGE and _PREFIXES[prefix] >= 1e6:
            raise QuantityError(f"{text!r} is beyond any bench (M is mega); {wanted}")
        return _PREFIXES[prefix]
    raise QuantityError(f"{text!r} is not in {dimension.unit}{_hint(unit, dimension) or f'; {wanted}'}")


def _hint(unit: str, dimension: Dimension) -> str:
    """Where only capitals are wrong, the unit that was likely meant."""
    order = ("", "k", "M", "G", "T", "m", "u", "n", "p", "f") if dimension in _LARGE else ("", *"kmunpf")
    prefixes = order if dimension.scaled else ("",)
    likely = (p + dimension.unit for p in prefixes if (p + dimension.unit).lower() == unit.lower())
    found = next(likely, "")
    return f'; did you mean "{found}"?' if found else ""


def parse_range(text: object, dimension: Dimension) -> tuple[float, float]:
    """Read two values joined by "to".

    Raises
    ------
    QuantityError
        If it is not two values, or they do not increase.

    Examples
    --------
    >>> parse_range("160 MHz to 175 MHz", Dimension.FREQUENCY)
    (160000000.0, 175000000.0)
    """
    parts = re.split(r"\s+to\s+", text.strip()) if isinstance(text, str) else []
    if len(parts) != 2:
        raise QuantityError(
            f'{text!r} is not a range; write it as "{dimension.example} to ..." with both units'
        )
    low, high = (parse(part, dimension) for part in parts)
    if not low < high:
        raise QuantityError(f"{text!r} does not increase; write the lower value first")
    return low, high


@functools.lru_cache(4096)
def render(value: float, dimension: Dimension, digits: int = 4) -> str:
    """Write one value for people.

    Parameters
    ----------
    value
        In ``dimension.unit``.
    digits
        Significant digits; decibels and the like get no more than three decimals.

    Examples
    --------
    >>> render(169.4e6, Dimension.FREQUENCY)
    '169.4 MHz'
    >>> render(-0.456, Dimension.RATIO)
    '-0.456 dB'
    """
    if not math.isfinite(value):
        return str(value)
    if dimension is Dimension.NUMBER:
        return f"{value + 0.0:.{digits}g}"  # adding zero turns -0.0 into 0.0
    if not dimension.scaled:
        return f"{round(value, 3) + 0.0:.{digits}g} {dimension.unit}"
    if value == 0:
        return f"0 {dimension.unit}"
    from quantiphy import Quantity  # 11 ms: only where something is printed

    return str(Quantity(value, dimension.unit).render(prec=digits - 1))
