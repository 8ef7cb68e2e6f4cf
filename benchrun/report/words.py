"""Values as people read them."""

from __future__ import annotations

import math

from benchrun.evaluate.judgement import JudgedFigure
from benchrun.quantity import Dimension, render

__all__ = ["amount", "difference", "duration", "limit", "outside"]

_DIMENSIONS = {"Hz": Dimension.FREQUENCY, "s": Dimension.TIME, "A": Dimension.CURRENT}


def amount(value: float | None, unit: str, places: int = 2) -> str:
    """A value with its unit.

    Examples
    --------
    >>> amount(0.3222, "dB"), amount(200585288.7, "Hz"), amount(1.27e-9, "s"), amount(None, "dB")
    ('0.32 dB', '200.6 MHz', '1.27 ns', 'none')
    """
    if value is None or not math.isfinite(value):
        return "none"
    if unit in _DIMENSIONS:
        return render(value, _DIMENSIONS[unit])
    text = f"{value:.{places}f}"
    return text if unit == "1" else f"{text} {unit}"


def difference(value: float | None, unit: str, places: int = 2) -> str:
    """A distance between two values: of two levels in dBm it is in dB.

    Examples
    --------
    >>> difference(2.5, "dBm"), difference(2.5, "A")
    ('2.50 dB', '2.5 A')
    """
    return amount(value, "dB" if unit == "dBm" else unit, places)


def limit(figure: JudgedFigure) -> str:
    """The limit with its side: ``at most 0.6 dB``."""
    if figure.unit in _DIMENSIONS:
        return f"{figure.side} {render(figure.limit, _DIMENSIONS[figure.unit])}"
    return f"{figure.side} {figure.limit:g}{'' if figure.unit == '1' else ' ' + figure.unit}"


def outside(figure: JudgedFigure) -> str:
    """Which limit is missed, where and by how much, in a sentence."""
    if figure.value is None or figure.margin is None:
        return f"{figure.name}: {figure.remark}"
    where = f" at {amount(figure.at_hz, 'Hz')}" if figure.at_hz is not None else ""
    said = f"{figure.name} is {amount(figure.value, figure.unit, 3)}{where}"
    if figure.margin < 0:
        return f"{said}, {difference(-figure.margin, figure.unit, 3)} beyond {limit(figure)}"
    room = f"only {difference(figure.margin, figure.unit, 3)} inside {limit(figure)}"
    why = (
        f" with U = {difference(figure.uncertainty, figure.unit, 3)}"
        if figure.uncertainty is not None
        else ""
    )
    return f"{said}, {room}{why}{'; ' + figure.remark if figure.remark else ''}"


def duration(seconds: float) -> str:
    """Seconds as people say them.

    Examples
    --------
    >>> duration(318.2), duration(4.26), duration(7300)
    ('5 min 18 s', '4.3 s', '2 h 1 min')
    """
    if seconds < 59.95:  # or it would be rounded to 60.0 s
        return f"{seconds:.1f} s"
    minutes, rest = divmod(round(seconds), 60)
    return f"{minutes} min {rest} s" if minutes < 60 else f"{minutes // 60} h {minutes % 60} min"
